package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"time"

	"nightbench/sweeps"
)

// Wait returns nil when an entry with a seq above after exists: at once, or
// when it is written. It polls nothing and misses nothing.
func (s *Store) Wait(ctx context.Context, after int64) error {
	if s.write == nil {
		return fmt.Errorf("wait for entries: %w; nobody rings here: ask the daemon for its stream", ErrReadOnly)
	}
	return s.bell.wait(ctx, after)
}

// Last is the seq of the newest entry; 0 when there is none.
func (s *Store) Last(ctx context.Context) (int64, error) { return s.lastSeq(ctx) }

func (s *Store) lastSeq(ctx context.Context) (int64, error) {
	return s.seq(ctx, `SELECT coalesce(max(seq), 0) FROM entry`)
}

// RunStart is the seq of a run's first entry, or ErrNotFound.
func (s *Store) RunStart(ctx context.Context, run int64) (int64, error) {
	seq, err := s.seq(ctx, `SELECT coalesce(min(seq), 0) FROM entry WHERE run = ?`, run)
	if err == nil && seq == 0 {
		return 0, fmt.Errorf("entries of run %d: %w", run, ErrNotFound)
	}
	return seq, err
}

func (s *Store) seq(ctx context.Context, q string, args ...any) (int64, error) {
	n, err := collect(ctx, s, scanID, q, args...)
	if err != nil {
		return 0, err
	}
	return n[0], nil
}

const entryColumns = `seq, coalesce(run, 0), at, elapsed, kind, words, state, point, off`

// Entries are up to limit entries after a seq, oldest first, whole: points
// with readings and predictions, curves, setpoints. Fewer than limit means that the tail was reached.
func (s *Store) Entries(ctx context.Context, after int64, limit int) ([]sweeps.Entry, error) {
	rows, err := collect(ctx, s, scanEntry, `SELECT `+entryColumns+`, curves, setpoints FROM entry WHERE seq > ? ORDER BY seq LIMIT ?`, after, limit)
	if err != nil {
		return nil, fmt.Errorf("entries after %d: %w", after, err)
	}
	if len(rows) == 0 {
		return []sweeps.Entry{}, nil
	}
	to := rows[len(rows)-1].Seq
	points, err := s.points(ctx, `id IN (SELECT point FROM entry WHERE seq > ? AND seq <= ?)`, after, to)
	if err != nil {
		return nil, fmt.Errorf("points after %d: %w", after, err)
	}
	byID := make(map[int64]*sweeps.Point, len(points))
	for i := range points {
		byID[points[i].id] = &points[i].Point
	}
	return entriesOf(rows, byID), nil
}

// Log is a run's entries but for points, oldest first, without curves and setpoints.
func (s *Store) Log(ctx context.Context, run int64) ([]sweeps.Entry, error) {
	rows, err := collect(ctx, s, scanEntry, `SELECT `+entryColumns+`, NULL, NULL FROM entry WHERE run = ? AND kind <> 'point' ORDER BY seq`, run)
	if err != nil {
		return nil, fmt.Errorf("log of run %d: %w", run, err)
	}
	return entriesOf(rows, nil), nil
}

// Plan is the newest order of visit and prediction announced for a run; empty where none was.
func (s *Store) Plan(ctx context.Context, run int64) ([]sweeps.Setpoint, []sweeps.Curve, error) {
	newest := func(column string) string {
		return `SELECT ` + column + ` FROM entry WHERE run = ? AND kind <> 'point' AND ` + column + ` IS NOT NULL ORDER BY seq DESC LIMIT 1`
	}
	setpoints, err := collect(ctx, s, scanList[sweeps.Setpoint], newest("setpoints"), run)
	if err != nil {
		return nil, nil, fmt.Errorf("setpoints of run %d: %w", run, err)
	}
	curves, err := collect(ctx, s, scanList[sweeps.Curve], newest("curves"), run)
	if err != nil {
		return nil, nil, fmt.Errorf("curves of run %d: %w", run, err)
	}
	return first(setpoints), first(curves), nil
}

// entryRow is an entry and the id of its point.
type entryRow struct {
	sweeps.Entry
	point sql.NullInt64
}

func scanEntry(rows *sql.Rows) (e entryRow, err error) {
	return e, rows.Scan(&e.Seq, &e.Run, timeColumn{&e.At}, &e.Elapsed, &e.Kind, &e.Words, &e.State, &e.point,
		jsonColumn{&e.Off}, jsonColumn{&e.Curves}, jsonColumn{&e.Setpoints})
}

func entriesOf(rows []entryRow, points map[int64]*sweeps.Point) []sweeps.Entry {
	entries := make([]sweeps.Entry, len(rows))
	for i, r := range rows {
		r.Point = points[r.point.Int64]
		entries[i] = r.Entry
	}
	return entries
}

func scanList[T any](rows *sql.Rows) (v []T, err error) { return v, rows.Scan(jsonColumn{&v}) }

// first is the first list, empty where there is none.
func first[T any](lists [][]T) []T {
	if len(lists) == 0 {
		return []T{}
	}
	return lists[0]
}

// collect runs a query on a reading connection and scans every row.
func collect[T any](ctx context.Context, s *Store, scan func(*sql.Rows) (T, error), q string, args ...any) (_ []T, err error) {
	rows, err := s.read.QueryContext(ctx, q, args...)
	if err != nil {
		return nil, s.orClosed(advise(err))
	}
	defer func() { err = errors.Join(err, advise(rows.Err()), rows.Close()) }()
	found := []T{}
	for rows.Next() {
		v, err := scan(rows)
		if err != nil {
			return nil, err
		}
		found = append(found, v)
	}
	return found, nil
}

// timeOf parses a time that may be NULL.
func timeOf(text sql.NullString) (*time.Time, error) {
	if !text.Valid {
		return nil, nil
	}
	t, err := time.Parse(timeLayout, text.String)
	return &t, err
}

// now is the clock's time, as the tables hold it.
func (s *Store) now() time.Time { return stamp(s.clock.Now()) }
