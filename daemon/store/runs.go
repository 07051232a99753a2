package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"strconv"

	"nightbench/sweeps"
)

// CreateRun writes a new run with its files and gives it its ID. Counters begin
// at 0, an empty State at preparing. It fails with [ErrRunOpen] while another run is open.
func (s *Store) CreateRun(ctx context.Context, r sweeps.Run) (sweeps.Run, error) {
	if r.State == "" {
		r.State = sweeps.Preparing
	}
	if r.StartedAt.IsZero() {
		r.StartedAt = s.now()
	}
	r.StartedAt, r.Measured, r.Flagged = stamp(r.StartedAt), 0, 0
	err := s.transact(ctx, func(w *write) (err error) {
		if err := w.noneOpen(); err != nil {
			return err
		}
		if r.ID, err = w.run(r); err != nil {
			return err
		}
		return w.files(r.ID, r.Files)
	})
	if err != nil {
		return sweeps.Run{}, fmt.Errorf("create run of plan %q: %w", r.Plan, err)
	}
	return r, nil
}

// noneOpen fails with ErrRunOpen, naming the run that is open.
func (w *write) noneOpen() error {
	var id int64
	var state string
	err := w.tx.QueryRowContext(w.ctx, `SELECT id, state FROM run WHERE ended_at IS NULL`).Scan(&id, &state)
	switch {
	case errors.Is(err, sql.ErrNoRows):
		return nil
	case err != nil:
		return err
	}
	return fmt.Errorf("%w: run %d is %s; stop it, or wait for its end", ErrRunOpen, id, state)
}

func (w *write) run(r sweeps.Run) (int64, error) {
	quantities, err := list(r.Quantities)
	if err != nil {
		return 0, err
	}
	instruments, err := list(r.Instruments)
	if err != nil {
		return 0, err
	}
	return w.insert(`INSERT INTO run (state, reason, plan, board, revision, board_serial, bench, operator, note,
		started_at, ended_at, planned, pace, seed, version, quantities, instruments)
		VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`,
		string(r.State), r.Reason, r.Plan, r.Board, r.Revision, r.BoardSerial, r.Bench, r.Operator, r.Note,
		timeText(r.StartedAt), timeOrNull(r.EndedAt), r.Planned, r.Pace, strconv.FormatUint(uint64(r.Seed), 10), r.Version, quantities, instruments)
}

func (w *write) files(run int64, files []sweeps.File) error {
	for i, f := range files {
		_, err := w.insert(`INSERT INTO file (run, position, role, name, sha256, text) VALUES (?, ?, ?, ?, ?, ?)`,
			run, i, f.Role, f.Name, f.SHA256, f.Text)
		if err != nil {
			return fmt.Errorf("file %s: %w", f.Name, err)
		}
	}
	return nil
}

// state moves a run to another state. Ending it writes when and why; leaving an ended state opens it again.
func (w *write) state(e sweeps.Entry) error {
	var ended, reason any = nil, ""
	if e.State.Ended() {
		ended, reason = timeText(e.At), e.Words
	}
	n, err := w.update(`UPDATE run SET state = ?, ended_at = ?, reason = ? WHERE id = ?`, string(e.State), ended, reason, e.Run)
	switch {
	case isTwice(err):
		return errors.Join(w.noneOpen(), err)
	case err == nil && n == 0:
		return fmt.Errorf("run %d: %w", e.Run, ErrNotFound)
	}
	return err
}

const runColumns = `id, state, reason, plan, board, revision, board_serial, bench, operator, note,
	started_at, ended_at, planned, measured, flagged, pace, seed, version, quantities, instruments`

// Runs are all runs, newest first, without their files.
func (s *Store) Runs(ctx context.Context) ([]sweeps.Run, error) {
	return collect(ctx, s, scanRun, `SELECT `+runColumns+` FROM run ORDER BY id DESC`)
}

// Run is one run with its files, or ErrNotFound.
func (s *Store) Run(ctx context.Context, id int64) (sweeps.Run, error) {
	rs, err := collect(ctx, s, scanRun, `SELECT `+runColumns+` FROM run WHERE id = ?`, id)
	if err != nil {
		return sweeps.Run{}, err
	}
	if len(rs) == 0 {
		return sweeps.Run{}, fmt.Errorf("run %d: %w; see the list of runs for the numbers there are", id, ErrNotFound)
	}
	rs[0].Files, err = collect(ctx, s, scanFile, `SELECT role, name, sha256, text FROM file WHERE run = ? ORDER BY position`, id)
	return rs[0], err
}

// OpenRun is the run that has not ended; false when there is none.
func (s *Store) OpenRun(ctx context.Context) (sweeps.Run, bool, error) {
	ids, err := collect(ctx, s, scanID, `SELECT id FROM run WHERE ended_at IS NULL`)
	if err != nil || len(ids) == 0 {
		return sweeps.Run{}, false, err
	}
	r, err := s.Run(ctx, ids[0])
	return r, err == nil, err
}

func scanRun(rows *sql.Rows) (r sweeps.Run, err error) {
	var ended sql.NullString
	var seed string
	err = rows.Scan(&r.ID, &r.State, &r.Reason, &r.Plan, &r.Board, &r.Revision, &r.BoardSerial, &r.Bench, &r.Operator, &r.Note,
		timeColumn{&r.StartedAt}, &ended, &r.Planned, &r.Measured, &r.Flagged, &r.Pace, &seed, &r.Version,
		jsonColumn{&r.Quantities}, jsonColumn{&r.Instruments})
	if err != nil {
		return r, err
	}
	if r.EndedAt, err = timeOf(ended); err != nil {
		return r, err
	}
	err = r.Seed.UnmarshalText([]byte(seed))
	return r, err
}

func scanFile(rows *sql.Rows) (f sweeps.File, err error) {
	return f, rows.Scan(&f.Role, &f.Name, &f.SHA256, &f.Text)
}

func scanID(rows *sql.Rows) (id int64, err error) { return id, rows.Scan(&id) }
