package app

import (
	"context"
	"errors"
	"fmt"
)

// undo is what has to be undone, in the order it was done. Each opening
// registers its undoing at once, so that a half-failed start and a normal stop
// share one path.
type undo struct{ steps []undoing }

type undoing struct {
	name string
	do   func(context.Context) error
}

func (u *undo) add(name string, do func(context.Context) error) {
	u.steps = append(u.steps, undoing{name, do})
}

// all undoes everything, last first, whatever fails on the way. Calling it again does nothing.
func (u *undo) all(ctx context.Context) (err error) {
	for i := len(u.steps) - 1; i >= 0; i-- {
		s := u.steps[i]
		if e := s.do(ctx); e != nil {
			err = errors.Join(err, fmt.Errorf("closing %s: %w", s.name, e))
		}
	}
	u.steps = nil
	return err
}
