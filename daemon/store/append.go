package store

import (
	"context"
	"fmt"

	"nightbench/sweeps"
)

// Append writes one entry in one transaction: with Point its point, readings,
// predictions and waveforms and the run's counters; with State the run's state,
// and on an ended one when and why (Words). It answers the entry with Seq and,
// where it was zero, At. When it answers nil the entry is on the disk and the
// bell has rung; after any error nothing of it is.
//
// Errors: ErrDuplicate, ErrRunOpen, ErrNotFound (no such run), ErrRefused,
// ErrFull, the context's cause. On a full disk the last words of a run (off,
// trip, making safe, ended) are written into the space kept in reserve.
func (s *Store) Append(ctx context.Context, e sweeps.Entry) (sweeps.Entry, error) {
	if e.At.IsZero() {
		e.At = s.now()
	}
	e.At = stamp(e.At)
	if e.Point != nil {
		p := *e.Point
		if p.At.IsZero() {
			p.At = e.At
		}
		p.At = stamp(p.At)
		e.Point = &p
	}
	err := check(e)
	if err == nil {
		e.Seq, err = s.append(ctx, e)
	}
	if err != nil {
		return sweeps.Entry{}, fmt.Errorf("append %s to run %d: %w", e.Kind, e.Run, err)
	}
	s.bell.ring(e.Seq)
	return e, nil
}

// append writes the entry; last words get a second chance in the reserve.
func (s *Store) append(ctx context.Context, e sweeps.Entry) (seq int64, err error) {
	once := func(w *write) (err error) { seq, err = w.entry(e); return err }
	err = s.transact(ctx, once)
	if !isFull(err) || !lastWord(e) {
		return seq, err
	}
	gave, rerr := s.reserve.release()
	if !gave {
		return 0, fmt.Errorf("%w (reserve: %v)", err, rerr)
	}
	return seq, s.transact(ctx, once)
}

// lastWord tells which entries may use the reserve: those that say how the bench was left.
func lastWord(e sweeps.Entry) bool {
	switch e.Kind {
	case sweeps.KindOff, sweeps.KindTrip, sweeps.KindEnded:
		return true
	}
	return e.State == sweeps.MakingSafe || e.State.Ended()
}

func (w *write) entry(e sweeps.Entry) (int64, error) {
	var run, point any
	if e.Run != 0 {
		run = e.Run
		if err := w.runExists(e.Run); err != nil {
			return 0, err
		}
	}
	if e.State != "" {
		if err := w.state(e); err != nil {
			return 0, err
		}
	}
	if e.Point != nil {
		id, err := w.point(e.Run, *e.Point)
		if err != nil {
			return 0, fmt.Errorf("setpoint %d: %w", e.Point.Setpoint.Index, err)
		}
		point = id
	}
	off, err := orNull(e.Off, e.Off == nil)
	if err != nil {
		return 0, err
	}
	curves, err := orNull(e.Curves, len(e.Curves) == 0)
	if err != nil {
		return 0, err
	}
	setpoints, err := orNull(e.Setpoints, len(e.Setpoints) == 0)
	if err != nil {
		return 0, err
	}
	return w.insert(`INSERT INTO entry (run, at, elapsed, kind, words, state, point, off, curves, setpoints)
		VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`,
		run, timeText(e.At), e.Elapsed, string(e.Kind), e.Words, string(e.State), point, off, curves, setpoints)
}

func (w *write) runExists(id int64) error {
	var n int
	if err := w.tx.QueryRowContext(w.ctx, `SELECT count(*) FROM run WHERE id = ?`, id).Scan(&n); err != nil {
		return err
	}
	if n == 0 {
		return fmt.Errorf("run %d: %w", id, ErrNotFound)
	}
	return nil
}

// point writes a point's rows and counts it.
func (w *write) point(run int64, p sweeps.Point) (int64, error) {
	n, err := w.update(`UPDATE run SET measured = measured + 1, flagged = flagged + ? WHERE id = ? AND ended_at IS NULL`, p.Flagged(), run)
	if err != nil {
		return 0, err
	}
	if n == 0 {
		return 0, fmt.Errorf("%w: run %d is over", ErrRefused, run)
	}
	flags, err := list(p.Flags)
	if err != nil {
		return 0, err
	}
	at := p.Setpoint
	id, err := w.insert(`INSERT INTO point (run, setpoint, supply_voltage, pot_code, pot_resistance, pot_position, direction, pass, recheck, at, elapsed, flags)
		VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`,
		run, at.Index, at.Supply, at.PotCode, at.Pot, at.Position, string(at.Direction), at.Pass, at.Recheck, timeText(p.At), p.Elapsed, flags)
	if isTwice(err) {
		return 0, ErrDuplicate
	}
	if err != nil {
		return 0, err
	}
	if err := w.readings(id, p.Readings); err != nil {
		return 0, err
	}
	if err := w.predictions(id, p.Predictions); err != nil {
		return 0, err
	}
	return id, w.records(id, p.Records)
}

func (w *write) readings(point int64, rs []sweeps.Reading) error {
	for i, r := range rs {
		flags, err := list(r.Flags)
		if err != nil {
			return err
		}
		raw, err := list(r.Raw)
		if err != nil {
			return err
		}
		_, err = w.insert(`INSERT INTO reading (point, position, quantity, value, u, dof, unit, road, flags, raw) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`,
			point, i, string(r.Quantity), number(r.Value), number(r.U), number(r.DOF), string(r.Unit), r.Road, flags, raw)
		if err != nil {
			return fmt.Errorf("%s by %s: %w", r.Quantity, r.Road, err)
		}
	}
	return nil
}

func (w *write) predictions(point int64, ps map[sweeps.Quantity]sweeps.Prediction) error {
	for q, p := range ps {
		_, err := w.insert(`INSERT INTO prediction (point, quantity, value, low, high, unit) VALUES (?, ?, ?, ?, ?, ?)`,
			point, string(q), p.Value, p.Low, p.High, string(p.Unit))
		if err != nil {
			return fmt.Errorf("prediction of %s: %w", q, err)
		}
	}
	return nil
}

// number is what a pointer holds, NULL for nil.
func number(v *float64) any {
	if v == nil {
		return nil
	}
	return *v
}
