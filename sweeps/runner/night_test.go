package runner_test

import (
	"context"
	"encoding/json"
	"fmt"
	"io"
	"log/slog"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync/atomic"
	"testing"
	"testing/synctest"
	"time"

	"nightbench/daemon/store"
	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/instruments/link"
	"nightbench/instruments/practice"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
	"nightbench/sweeps/runner"
	"nightbench/sweeps/schedule"
)

// boardFile is the dosing pump driver, revision B, as its schematic has it; its capacitor (nF) is put in.
const boardFile = `
[board]
name = "Dosing pump driver"
revision = "B"
rated_supply = ["7 V", "12 V"]

[timer]
part = "bipolar"

[timing]
network = "steered"
charge = "10k 1%%"
discharge = "pot"                       # the bench's pot stands here
stop = "470 1%%"                         # in series with the pot: bounds the current through its wiper
capacitor = "%gn 5%%"                    # film
charge_diode = "1N4148"
discharge_diode = "1N4148"

[driver]
stage = "nmos"
part = { rds_on = 0.05, vgs_th = 1.5 }  # a logic-level MOSFET, ohms and volts
gate_resistor = "100 5%%"
flyback = "1N5819"

[load]
kind = "motor"
resistance = "12 10%%"
inductance = "5 mH 20%%"
torque_constant = "8 mV s/rad"
static_torque = "0.6 mN m"
coulomb_torque = "0.4 mN m"
viscous_torque = "0.2 uN m s"
inertia = "5 g cm2"                     # with the pump's rotor: the speed hardly ripples
`

// A night is a run in a bubble: practice instruments behind pipes, the real
// drivers, a real journal, and a clock that jumps. Bench and wall time are the
// same there, unless a test sets a pace.
type night struct {
	*testing.T
	clock    instruments.Clock
	practice *practice.Bench
	opened   *bench.Opened
	store    *store.Store
	cables   map[string]*cable // by instrument
	supply   *record           // the practice supply's own log
	mark     *spyMark
	log      *record
	lie      atomic.Pointer[func(*instruments.SupplyState)] // about the supply's state while it is on
	board    string                                         // the board file that goes with the true board
	options  runner.Options
	run      *runner.Runner
	last     context.Context
	giveUp   context.CancelFunc
}

// pump is the true board, every part at its nominal value (the timer as in the built-in catalogue's figures, rounded).
// light is the pump on a clock instead of a timer: a tenth of the computing, for
// what does not depend on how the duty comes about.
func light() circuit.Board {
	b := pump()
	b.Timing = circuit.Timing{Network: circuit.Clocked, Period: 12e-3, Duty: 0.4, Capacitance: 100e-9} // the capacitance goes into the board file only
	return b
}

func pump() circuit.Board {
	signal := circuit.Diode{Is: 2.52e-9, N: 1.752, Rs: 0.568}
	return circuit.Board{
		Source: circuit.Source{Resistance: 0.05, Bulk: 470e-6, Bleed: 2200},
		Timer: circuit.Timer{Threshold: 2. / 3, Trigger: 0.5, Delay: 100e-9, DischargeResistance: 15, MinSupply: 3, Rise: 100e-9, Fall: 100e-9,
			Drop:      circuit.Levels{{Supply: 9, Points: []circuit.Point{{Amps: 0, Volts: 1.2}, {Amps: 0.1, Volts: 1.7}}}},
			Low:       circuit.Levels{{Supply: 9, Points: []circuit.Point{{Amps: 0, Volts: 0.05}, {Amps: 0.1, Volts: 1}}}},
			Quiescent: []circuit.Quiescent{{Volts: 5, Amps: 3e-3}, {Volts: 15, Amps: 10e-3}},
			Clamp:     circuit.Diode{Is: 1e-12, N: 1, Rs: 1}},
		Timing: circuit.Timing{Network: circuit.Steered, Common: 10e3, Down: 470, Pot: circuit.PotDown, Capacitance: 22e-9,
			ChargeDiode: &signal, DischargeDiode: &signal},
		Driver:  circuit.Driver{Stage: circuit.NMOS, Resistance: 0.05, RatedGate: 4.5, GateLevel: 1.5, Breakdown: 30, Edge: 50e-9, Body: &circuit.Diode{Is: 1e-11, N: 1.1, Rs: 0.03}},
		Flyback: &circuit.Diode{Is: 31.7e-6, N: 1.373, Rs: 0.051},
		Load: circuit.Load{Kind: circuit.Motor, Resistance: 12, Inductance: 5e-3, Constant: 8e-3, StaticTorque: 0.6e-3, CoulombTorque: 0.4e-3,
			ViscousTorque: 0.2e-6, Inertia: 5e-7, Burden: 0.3},
	}
}

// onBoard runs f in a bubble. Leaving it fails when a goroutine is left behind.
func onBoard(t *testing.T, b circuit.Board, plan string, f func(n *night)) {
	t.Helper()
	atPace(t, 1, b, plan, f)
}

// atPace is onBoard with bench time running faster than the wall.
func atPace(t *testing.T, pace float64, b circuit.Board, plan string, f func(n *night)) {
	t.Helper()
	synctest.Test(t, func(t *testing.T) {
		n := &night{T: t, clock: instruments.NewClock(pace), cables: map[string]*cable{}, supply: &record{}, log: &record{}}
		n.board = fmt.Sprintf(boardFile, b.Timing.Capacitance*1e9)
		n.wire(b)
		n.open(plan)
		f(n)
	})
}

// wire builds the practice bench and opens it through the real drivers over pipes.
func (n *night) wire(b circuit.Board) {
	n.Helper()
	var err error
	n.practice, err = practice.New(practice.Config{
		Board: b, Clock: n.clock, Seed: 7, SupplyLog: n.supply,
		Pot: practice.Pot{Codes: 257, Track: 100e3, Wiper: 75, Start: 128},
		Meters: []practice.Meter{
			{Name: "average", Probe: circuit.Between(circuit.LoadHi, circuit.LoadLo), Unit: si.Volt},
			{Name: "motor", Probe: circuit.Through(circuit.LoadCurrent), Unit: si.Ampere},
		},
		Channels: []practice.Channel{{Number: 1, Probe: circuit.Between(circuit.TimerOut, circuit.Common)}, {Number: 2, Probe: circuit.Between(circuit.LoadLo, circuit.Common)}},
	})
	n.must(err)
	n.Cleanup(func() { n.practice.Close() })
	lines := strings.Split(benchFile, "\n")
	port := 0
	for i, l := range lines {
		switch {
		case strings.HasPrefix(l, "address = "):
			port++
			lines[i] = fmt.Sprintf("address = \"tcp://127.0.0.1:%d\"", port)
		case strings.HasPrefix(l, "name = ") && port == 0:
			lines[i] = "name = \"Practice bench\"\npractice = true"
		}
	}
	path := filepath.Join(n.TempDir(), "bench.toml")
	n.must(os.WriteFile(path, []byte(strings.Join(lines, "\n")), 0o600))
	file, err := bench.Read(path)
	n.must(err)
	for _, i := range n.practice.Instruments() {
		n.cables[i.Name] = &cable{to: i}
	}
	dial := func(_ context.Context, a link.Address) (io.ReadWriteCloser, error) {
		var which int
		if _, err := fmt.Sscanf(a.String(), "tcp://127.0.0.1:%d", &which); err != nil {
			return nil, err
		}
		return n.cables[n.practice.Instruments()[which-1].Name].dial()
	}
	n.opened, err = bench.Open(n.Context(), file, bench.Options{Clock: n.clock, Dial: dial})
	n.must(err)
	n.Cleanup(func() {
		ctx, end := context.WithTimeout(context.Background(), time.Minute)
		defer end()
		n.opened.Close(ctx) // a cable may be cut: what it says is of no use here
	})
}

// open makes journal, plan and the run's options. Change them before conducting.
func (n *night) open(text string) {
	n.Helper()
	dir := n.TempDir()
	var err error
	n.store, err = store.Open(n.Context(), filepath.Join(dir, "nightbench.db"), n.clock)
	n.must(err)
	n.Cleanup(func() { n.must(n.store.Close(context.Background())) })
	plan, board, err := sweeps.ParseFiles(sweeps.File{Name: "plan.toml", Text: text}, sweeps.File{Name: "board.toml", Text: n.board})
	n.must(err)
	w := n.opened.Bench.Wiring
	n.must(sweeps.CheckPlan(plan, board, &w))
	order, err := schedule.Order(plan, w.Pot, 1)
	n.must(err)
	model, err := predict.New(board, predict.Options{PotTolerance: w.Pot.Tolerance})
	n.must(err)
	run, err := n.store.CreateRun(n.Context(), sweeps.Run{State: sweeps.Preparing, StartedAt: n.clock.Now(), Plan: plan.Name, Planned: len(order), Pace: 1, Quantities: plan.Measure.Quantities})
	n.must(err)
	n.mark = &spyMark{night: n}
	through := &supply{Supply: n.opened.Bench.Supply}
	through.state = func(ctx context.Context) (instruments.SupplyState, error) {
		s, err := through.Supply.State(ctx)
		if lie := n.lie.Load(); lie != nil && s.Output {
			(*lie)(&s)
		}
		return s, err
	}
	n.opened.Bench.Supply = through
	n.last, n.giveUp = context.WithCancel(context.Background())
	n.Cleanup(n.giveUp)
	n.options = runner.Options{
		Bench: n.opened.Bench, Clock: n.clock, Journal: n.store, Mark: n.mark, Predict: schematic{model.Draw(40, 1), 12.3}, Board: board, Plan: plan, Run: run, Order: order,
		Safe: instruments.SafeSpec{Below: si.Volts(0.5)}, Log: slog.New(slog.NewTextHandler(n.log, nil)),
	}
}

func (n *night) must(err error) {
	n.Helper()
	if err != nil {
		n.Fatal(err)
	}
}

// conduct carries the run out to its end.
func (n *night) conduct() runner.Outcome { return n.conductIn(n.Context()) }

func (n *night) conductIn(ctx context.Context) runner.Outcome {
	n.run = runner.New(n.options)
	return n.run.Conduct(ctx, n.last)
}

// begin lets the run go on its own; the channel has its end.
func (n *night) begin() <-chan runner.Outcome {
	n.run = runner.New(n.options)
	end := make(chan runner.Outcome, 1)
	go func() { end <- n.run.Conduct(n.Context(), n.last) }()
	return end
}

// until waits, in bench time, for something to become true.
func (n *night) until(what string, ok func() bool) {
	n.Helper()
	for range 20_000 {
		if ok() {
			return
		}
		time.Sleep(10 * time.Millisecond)
	}
	n.Fatalf("never: %s; the run is %s", what, n.run.State())
}

// points are those of the journal.
func (n *night) points() []sweeps.Point {
	n.Helper()
	p, err := n.store.Points(context.Background(), n.options.Run.ID)
	n.must(err)
	return p
}

// measured waits for k points.
func (n *night) measured(k int) {
	n.Helper()
	n.until(fmt.Sprintf("%d points", k), func() bool { return n.run.Vitals().Measured >= k })
}

func (n *night) entries() []sweeps.Entry {
	n.Helper()
	e, err := n.store.Log(context.Background(), n.options.Run.ID)
	n.must(err)
	return e
}

// said tells whether the run's log has words in an entry of a kind.
func (n *night) said(kind sweeps.Kind, words string) bool {
	return slices.ContainsFunc(n.entries(), func(e sweeps.Entry) bool { return e.Kind == kind && strings.Contains(e.Words, words) })
}

// output is the practice supply's own word on its output, and how often it was switched on.
func (n *night) output() (on bool, times int) {
	for _, l := range n.supplyLog() {
		if l.Output != nil {
			if on = *l.Output; on {
				times++
			}
		}
	}
	return on, times
}

func (n *night) supplyLog() (lines []practice.LogLine) {
	n.Helper()
	for text := range strings.Lines(n.supply.String()) {
		var l practice.LogLine
		n.must(json.Unmarshal([]byte(text), &l))
		lines = append(lines, l)
	}
	return lines
}

// safe holds what must be true after every end of a run that could be confirmed.
func (n *night) safe(end runner.Outcome, state sweeps.State, reason string) {
	n.Helper()
	if end.State != state || !strings.Contains(end.Reason, reason) {
		n.Errorf("ended %s: %q; want %s with %q", end.State, end.Reason, state, reason)
	}
	if on, _ := n.output(); on {
		n.Error("by the supply's own log its output is still on")
	}
	if !end.Off.Confirmed || !slices.Contains(end.Off.By, "supply") {
		n.Errorf("off is not confirmed: %+v", end.Off)
	}
	if v := n.run.Vitals(); v.Energised != sweeps.EnergisedNo || v.State != state {
		n.Errorf("vitals say energised %s, state %s", v.Energised, v.State)
	}
	if n.mark.isSet() {
		n.Error("the energised record is still there")
	}
	n.once()
}

// journaled holds that the journal tells the same end.
func (n *night) journaled(end runner.Outcome) {
	n.Helper()
	run, err := n.store.Run(context.Background(), n.options.Run.ID)
	n.must(err)
	if run.State != end.State || run.Reason != end.Reason || run.EndedAt == nil {
		n.Errorf("the journal has %s %q, ended %v; the run ended %s %q", run.State, run.Reason, run.EndedAt, end.State, end.Reason)
	}
	if run.Measured != len(n.points()) {
		n.Errorf("the journal counts %d points and has %d", run.Measured, len(n.points()))
	}
	kinds := map[sweeps.Kind]int{}
	for _, e := range n.entries() {
		kinds[e.Kind]++
	}
	if kinds[sweeps.KindEnded] != 1 || kinds[sweeps.KindOff] == 0 {
		n.Errorf("entries: %v; want one end, and how off was confirmed", kinds)
	}
	if bad := end.State == sweeps.Tripped || end.State == sweeps.Failed; bad != (kinds[sweeps.KindTrip] == 1) {
		n.Errorf("entries: %v for a run that %s", kinds, end.State)
	}
}

// once holds that no setpoint was measured twice.
func (n *night) once() {
	n.Helper()
	seen := map[int]bool{}
	for _, p := range n.points() {
		if seen[p.Setpoint.Index] {
			n.Errorf("setpoint %d is there twice", p.Setpoint.Index)
		}
		seen[p.Setpoint.Index] = true
	}
}
