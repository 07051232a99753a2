package link

import (
	"context"
	"errors"
)

// Blind sends one line at once, without waiting for its turn and without a
// reply: for switching an output off. When somebody else is in the middle of
// an exchange the line goes in between, and interjected is true: the replies
// of that exchange can no longer be trusted. When the stream is lost or will
// not take the line it is abandoned, opened anew, and the line sent there,
// once. The context and twice the write time-out bound it all.
func (l *Link) Blind(ctx context.Context, line string) (interjected bool, err error) {
	select {
	case <-l.life.Done():
		return false, l.fault("send", ErrClosed)
	case <-l.turn:
		t := &Turn{Timeout: l.opt.Timeout, l: l}
		defer t.Release()
		return false, t.insist(ctx, line)
	default:
	}
	w := l.wire.Load()
	if w != nil && l.post(ctx, w, line) == nil {
		return true, nil
	}
	if w != nil {
		go w.shut() // frees whoever is waiting on it; bounded by itself
	}
	t, err := l.Acquire(ctx)
	if err != nil {
		return true, err
	}
	defer t.Release()
	return true, t.insist(ctx, line)
}

// insist sends a line and, if the stream fails, sends it once more on a new
// one.
func (t *Turn) insist(ctx context.Context, line string) error {
	err := t.Send(ctx, line)
	if err == nil || t.l.ending.Load() {
		return err
	}
	if again := t.Reopen(ctx); again != nil {
		return errors.Join(err, again)
	}
	return t.Send(ctx, line)
}
