package app

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"math/rand/v2"
	"path/filepath"
	"time"

	"nightbench/daemon/web"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
	"nightbench/sweeps/schedule"
)

// active is the open run: its conductor and how to wait for it.
type active struct {
	id     int64
	runner *runner.Runner
	cancel context.CancelCauseFunc
	done   chan struct{} // closed when the run is over and the bench safe
	end    runner.Outcome
}

// Start reads plan and board, checks them against the bench, opens a run and lets it go.
func (d *Daemon) Start(ctx context.Context, q web.StartRequest) (sweeps.Run, error) {
	plan, board, err := sweeps.ReadPlan(q.Plan)
	if err != nil {
		return sweeps.Run{}, web.Fail(web.Invalid, err)
	}
	job, err := d.job(plan, board, rand.Uint64())
	if err != nil {
		return sweeps.Run{}, err
	}
	run := job.Run
	run.BoardSerial, run.Operator, run.Note, run.State, run.StartedAt = q.BoardSerial, q.Operator, q.Note, sweeps.Preparing, d.clock.Now()
	return d.begin(ctx, job, func() (sweeps.Run, error) { return d.store.CreateRun(ctx, run) }, "Started"+by(q.Operator)+"."+whoAttends(plan)+saidAmbient(plan))
}

func by(operator string) string {
	if operator == "" {
		return ""
	}
	return " by " + operator
}

// job is all a run of this plan on this bench needs, the journal's part apart.
func (d *Daemon) job(plan sweeps.Plan, board sweeps.Board, seed uint64) (runner.Options, error) {
	w := d.bench.Bench.Wiring
	if err := sweeps.CheckPlan(plan, board, &w); err != nil {
		return runner.Options{}, web.Fail(web.Invalid, err)
	}
	attended, err := attendance(plan, w, d.bench.Bench.Cutoff, d.bench.Unproven(), d.clock.Now())
	if err != nil {
		return runner.Options{}, web.Fail(web.Invalid, err)
	}
	ambient, _ := Ambient(plan)
	p, err := newPredictor(board, w, ambient, seed)
	if err != nil {
		return runner.Options{}, web.Fail(web.Invalid, err)
	}
	order, err := schedule.Order(plan, w.Pot, seed)
	if err != nil {
		return runner.Options{}, web.Fail(web.Invalid, err)
	}
	if _, err := p.judge(order); err != nil {
		return runner.Options{}, web.Fail(web.Invalid, fmt.Errorf("%s: %w", plan.Path, err))
	}
	o := runner.Options{Bench: d.bench.Bench, Clock: d.clock, Journal: d.store, Mark: d.mark, Predict: p, Board: board, Plan: plan, Order: order, Safe: safe(), Log: d.o.Log}
	if o.SafeBy, err = safeBy(plan.SafeBy, d.clock.Now()); err != nil {
		return runner.Options{}, err
	}
	if !attended.IsZero() && (o.SafeBy.IsZero() || attended.Before(o.SafeBy)) {
		o.SafeBy = attended
	}
	o.Run = sweeps.Run{
		Plan: plan.Name, Board: board.Name, Revision: board.Revision, Bench: w.Bench, Planned: len(order), Pace: d.clock.Pace(), Seed: sweeps.Seed(seed),
		Version: d.o.Version, Quantities: plan.Measure.Quantities, Instruments: d.identities(),
		Files: []sweeps.File{file("bench", d.file.Path, d.file.Text), file("board", board.Path, board.Text), file("plan", plan.Path, plan.Text)},
	}
	for _, p := range board.Parts {
		o.Run.Files = append(o.Run.Files, file(sweeps.RoleParts, p.Name, p.Text))
	}
	return o, nil
}

func file(role, path, text string) sweeps.File {
	sum := sha256.Sum256([]byte(text))
	return sweeps.File{Role: role, Name: filepath.Base(path), SHA256: hex.EncodeToString(sum[:]), Text: text}
}

// filesOf reads plan, board and the board's parts from a run's own copies.
func filesOf(run sweeps.Run) (sweeps.Plan, sweeps.Board, error) {
	var planFile, boardFile sweeps.File
	for _, f := range run.Files {
		switch f.Role {
		case "plan":
			planFile = f
		case "board":
			boardFile = f
		}
	}
	return sweeps.ParseFiles(planFile, boardFile, sweeps.PartsOf(run.Files)...)
}

// begin opens the run in the journal and conducts it in a goroutine that end, Stop
// and Off wait for.
func (d *Daemon) begin(ctx context.Context, o runner.Options, open func() (sweeps.Run, error), words string) (sweeps.Run, error) {
	offs, err := d.reserve()
	if err != nil {
		return sweeps.Run{}, err
	}
	defer d.release()
	curves := o.Predict.Curves(o.Order)
	run, err := open()
	if err != nil {
		return sweeps.Run{}, err
	}
	started := sweeps.Entry{Run: run.ID, Elapsed: o.Before.Seconds(), Kind: sweeps.KindStarted, Words: words, Setpoints: o.Order, Curves: curves}
	if _, err := d.store.Append(ctx, started); err != nil {
		return sweeps.Run{}, d.giveUp(run, err)
	}
	o.Run = run
	running, cancel := context.WithCancelCause(context.Background())
	a := &active{id: run.ID, runner: runner.New(o), cancel: cancel, done: make(chan struct{})}
	if !d.adopt(a, offs) {
		cancel(nil)
		return sweeps.Run{}, d.giveUp(run, conflict("Outputs off was pressed, or the daemon is ending, while the run was being prepared"))
	}
	go d.conduct(running, a)
	return run, nil
}

// reserve makes sure that one run at a time is being started; offs tells later whether somebody pressed Outputs off meanwhile.
func (d *Daemon) reserve() (offs int, err error) {
	d.mu.Lock()
	defer d.mu.Unlock()
	switch {
	case d.run != nil:
		return 0, conflict("run %d is open: stop it first, or wait for its end", d.run.id)
	case d.starting:
		return 0, conflict("another run is being started")
	case d.ending:
		return 0, conflict("the daemon is ending")
	case d.idle.Energised == sweeps.EnergisedUnconfirmed:
		return 0, conflict("off is not confirmed: press Outputs off, or see to the supply by hand, before starting")
	case d.idle.Energised == sweeps.EnergisedYes:
		return 0, conflict("the supply's output is on though no run is open: press Outputs off, or find out who feeds the board, before starting")
	}
	d.starting = true
	return d.offs, nil
}

func (d *Daemon) release() {
	d.mu.Lock()
	defer d.mu.Unlock()
	d.starting = false
}

// adopt makes a the open run, unless the outputs were switched off since or the daemon ends.
func (d *Daemon) adopt(a *active, offs int) bool {
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.offs != offs || d.ending {
		return false
	}
	d.run = a
	return true
}

// giveUp ends a run that never got a conductor.
func (d *Daemon) giveUp(run sweeps.Run, why error) error {
	ctx, cancel := context.WithTimeout(context.Background(), closeBudget)
	defer cancel()
	_, err := d.store.Append(ctx, sweeps.Entry{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Failed, Words: why.Error()})
	return errors.Join(why, err)
}

// safeBy is the next time the clock on the wall shows hh:mm; zero for none.
func safeBy(text string, now time.Time) (time.Time, error) {
	if text == "" {
		return time.Time{}, nil
	}
	t, err := time.ParseInLocation("15:04", text, time.Local)
	if err != nil {
		return time.Time{}, fmt.Errorf("safe_by = %q: write it like \"07:00\"", text)
	}
	n := now.Local()
	by := time.Date(n.Year(), n.Month(), n.Day(), t.Hour(), t.Minute(), 0, 0, time.Local)
	if !by.After(n) {
		by = by.AddDate(0, 0, 1)
	}
	return by, nil
}

// identities are the instruments as one line each.
func (d *Daemon) identities() []string {
	var lines []string
	for _, i := range d.bench.Info {
		lines = append(lines, fmt.Sprintf("%s: %s, firmware %s, dialect %s, at %s", i.Name, i.Identity, i.Identity.Firmware, i.Dialect, i.Address))
	}
	return lines
}
