package store

import (
	"context"
	"database/sql"
	"encoding/json"
	"fmt"
	"math"
	"time"
)

// transact runs do in one transaction. The wait for the one writing connection
// ends with ctx; once begun the transaction is carried through, so that a
// cancelled caller knows: an error of its context means that nothing was written.
func (s *Store) transact(ctx context.Context, do func(*write) error) error {
	if s.write == nil {
		return ErrReadOnly
	}
	if ctx.Err() != nil {
		return context.Cause(ctx)
	}
	conn, err := s.write.Conn(ctx)
	if err != nil {
		return s.orClosed(err)
	}
	defer conn.Close()
	ctx = context.WithoutCancel(ctx)
	tx, err := conn.BeginTx(ctx, nil)
	if err != nil {
		return s.orClosed(advise(err))
	}
	w := &write{ctx: ctx, tx: tx}
	if err := do(w); err != nil {
		tx.Rollback() // fails only where SQLite has rolled back by itself
		return advise(err)
	}
	return advise(tx.Commit())
}

// orClosed is ErrClosed when the store has been closed, else err.
func (s *Store) orClosed(err error) error {
	if _, ended, _ := s.bell.look(math.MaxInt64); ended {
		return ErrClosed
	}
	return err
}

// write is one transaction in the making.
type write struct {
	ctx context.Context
	tx  *sql.Tx
}

// insert runs one statement and answers the row's id.
func (w *write) insert(q string, args ...any) (int64, error) {
	r, err := w.tx.ExecContext(w.ctx, q, args...)
	if err != nil {
		return 0, err
	}
	return r.LastInsertId()
}

// update runs one statement and answers how many rows it changed.
func (w *write) update(q string, args ...any) (int64, error) {
	r, err := w.tx.ExecContext(w.ctx, q, args...)
	if err != nil {
		return 0, err
	}
	return r.RowsAffected()
}

// timeLayout is how times stand in the tables: text that sorts as it reads.
const timeLayout = "2006-01-02T15:04:05.000000Z"

// stamp rounds a time to what the tables hold, so that what Append answers is what is read later.
func stamp(t time.Time) time.Time { return t.UTC().Round(0).Truncate(time.Microsecond) }

func timeText(t time.Time) string { return stamp(t).Format(timeLayout) }

func timeOrNull(t *time.Time) any {
	if t == nil {
		return nil
	}
	return timeText(*t)
}

// timeColumn scans a time.
type timeColumn struct{ to *time.Time }

func (c timeColumn) Scan(v any) error {
	text, ok := v.(string)
	if !ok {
		return fmt.Errorf("a time is text, not %T", v)
	}
	t, err := time.Parse(timeLayout, text)
	*c.to = t
	return err
}

// jsonColumn scans JSON text; NULL leaves what it points to alone.
type jsonColumn struct{ to any }

func (c jsonColumn) Scan(v any) error {
	switch text := v.(type) {
	case nil:
		return nil
	case string:
		return json.Unmarshal([]byte(text), c.to)
	}
	return fmt.Errorf("JSON is text, not %T", v)
}

// list is a slice as a JSON array, never null.
func list[T any](v []T) (string, error) {
	if v == nil {
		v = []T{}
	}
	b, err := json.Marshal(v)
	return string(b), err
}

// orNull is a value as JSON, NULL where there is none.
func orNull[T any](v T, none bool) (any, error) {
	if none {
		return nil, nil
	}
	b, err := json.Marshal(v)
	return string(b), err
}
