package link

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"strings"
	"time"
)

// Turn is the right to talk on a link. It belongs to one goroutine and ends
// with Release.
type Turn struct {
	// Timeout bounds one reply line, and the gap between the bytes of a
	// block. It starts as the link's.
	Timeout time.Duration

	l    *Link
	over bool
}

// Release gives the link to the next one waiting. A second call does nothing.
func (t *Turn) Release() {
	if !t.over {
		t.over = true
		t.l.turn <- struct{}{}
	}
}

// Send sends one line with the terminator. Outcomes: nil, the bytes have left
// this program; ErrTimeout, the line was not taken in time and part of it may
// have left, which the next line will make good by starting with a
// terminator; ErrLost; ErrClosed; or the context's cause.
func (t *Turn) Send(ctx context.Context, line string) error {
	w := t.l.wire.Load()
	if w == nil {
		return t.l.fault("send", ErrLost)
	}
	return t.l.post(ctx, w, line)
}

// post sends a line on w. After a torn line a bare terminator goes first: it
// ends the fragment, and alone it is an empty message, which is no error.
func (l *Link) post(ctx context.Context, w *wire, line string) error {
	data := line + l.opt.Terminator
	if l.torn.Load() {
		data = l.opt.Terminator + data
	}
	err := w.send(ctx, []byte(data))
	switch {
	case err == nil:
		l.torn.Store(false)
		return nil
	case errors.Is(err, errStuck), errors.Is(err, ErrLost):
		l.torn.Store(true)
	}
	l.stale.Store(true)
	return l.fault("send", l.ended(err))
}

// ended says whether a stream that was shut was shut by Close, or given up to
// be opened anew.
func (l *Link) ended(err error) error {
	switch {
	case !errors.Is(err, errShut):
		return err
	case l.ending.Load():
		return fmt.Errorf("%w: %w", ErrClosed, err)
	default:
		return lost(err)
	}
}

// Waiting returns what has been received and not yet read, without waiting
// and without leading blanks (CR, NL, NUL, space), which no reply starts with.
func (t *Turn) Waiting() []byte {
	w := t.l.wire.Load()
	for w != nil {
		select {
		case chunk, ok := <-w.in:
			if ok {
				t.l.buf = append(t.l.buf, chunk...)
				continue
			}
		default:
		}
		break
	}
	t.skipBlanks()
	return t.l.buf
}

// blanks may stand before or after a reply: terminators of every kind of
// talker, and padding.
const blanks = "\r\n\x00 "

func (t *Turn) skipBlanks() { t.l.buf = bytes.TrimLeft(t.l.buf, blanks) }

// ReadLine reads one reply line and strips the blanks around it. Outcomes:
// the line; ErrTimeout after the link's time-out, counted from the call;
// ErrTooLong; ErrLost; ErrClosed; or the context's cause. After any error the
// reply may still come. An empty line is no reply, since nobody can tell it
// from a terminator left over by the reply before; when nothing else comes
// the time-out says so.
func (t *Turn) ReadLine(ctx context.Context) (string, error) {
	late := time.NewTimer(t.Timeout)
	defer late.Stop()
	t.expect()
	for blank := 0; ; {
		blank += len(t.l.buf)
		t.skipBlanks()
		blank -= len(t.l.buf)
		if end := bytes.IndexByte(t.l.buf, t.l.opt.ReplyEnd); end >= 0 {
			line := strings.TrimRight(string(t.l.buf[:end]), blanks)
			t.l.buf = t.l.buf[end+1:]
			return line, nil
		}
		if len(t.l.buf) > t.l.opt.ReplyLimit {
			return "", t.spoilt("read", fmt.Errorf("%w: %d bytes without an end", ErrTooLong, len(t.l.buf)))
		}
		if err := t.more(ctx, late.C); err != nil {
			switch {
			case len(t.l.buf) > 0:
				err = fmt.Errorf("%w: only %q came", err, clip(t.l.buf))
			case blank > 0:
				err = fmt.Errorf("%w: only an empty line came", err)
			}
			return "", t.spoilt("read", err)
		}
	}
}

// ReadFull reads exactly n bytes, whatever they are. The time-out counts
// anew whenever bytes arrive, since a long block on a slow line takes
// minutes; the context bounds the whole. On an error the bytes that did come
// are returned beside it.
func (t *Turn) ReadFull(ctx context.Context, n int) ([]byte, error) {
	late := time.NewTimer(t.Timeout)
	defer late.Stop()
	if len(t.l.buf) < n {
		t.expect()
	}
	for len(t.l.buf) < n {
		if err := t.more(ctx, late.C); err != nil {
			got := t.take(len(t.l.buf))
			return got, t.spoilt("read", fmt.Errorf("%w: got %d of %d bytes", err, len(got), n))
		}
		late.Reset(t.Timeout)
	}
	return t.take(n), nil
}

// Peek waits, at most the time-out, until n bytes are there, leading blanks
// apart, and gives them without taking them. A reply may end before.
func (t *Turn) Peek(ctx context.Context, n int) ([]byte, error) {
	late := time.NewTimer(t.Timeout)
	defer late.Stop()
	t.expect()
	for t.skipBlanks(); len(t.l.buf) < n; t.skipBlanks() {
		if err := t.more(ctx, late.C); err != nil {
			return bytes.Clone(t.l.buf), t.spoilt("read", err)
		}
	}
	return bytes.Clone(t.l.buf[:n]), nil
}

func (t *Turn) take(n int) []byte {
	got := bytes.Clone(t.l.buf[:n])
	t.l.buf = t.l.buf[n:]
	return got
}

// more waits for some bytes.
func (t *Turn) more(ctx context.Context, late <-chan time.Time) error {
	w := t.l.wire.Load()
	if w == nil {
		return ErrLost
	}
	select {
	case chunk, ok := <-w.in:
		if !ok {
			return t.l.ended(w.err)
		}
		t.l.buf = append(t.l.buf, chunk...)
		return nil
	case <-t.l.life.Done():
		return ErrClosed
	case <-ctx.Done():
		return ended(ctx)
	case <-late:
		return ErrTimeout
	}
}

// Listen waits until the instrument has been quiet for d, and returns what it
// said meanwhile other than blanks; it returns at once when there is such a
// thing. The bytes stay to be read.
func (t *Turn) Listen(ctx context.Context, d time.Duration) ([]byte, error) {
	for range 16 { // blanks that never end are no silence
		if said := t.Waiting(); len(said) > 0 {
			return said, nil
		}
		quiet := time.NewTimer(d)
		err := t.more(ctx, quiet.C)
		quiet.Stop()
		switch {
		case errors.Is(err, ErrTimeout) && ctx.Err() == nil:
			return t.Waiting(), nil
		case err != nil:
			return nil, t.spoilt("read", err)
		}
	}
	return nil, t.spoilt("read", fmt.Errorf("%w: nothing but terminators", ErrBabble))
}

// spoilt notes that a reply may still be on its way.
func (t *Turn) spoilt(op string, err error) error {
	t.l.stale.Store(true)
	return t.l.fault(op, err)
}

// Reopen closes the stream and opens it anew. What was received before is
// gone; a late reply can still come, if the instrument keeps it.
func (t *Turn) Reopen(ctx context.Context) error {
	l := t.l
	if w := l.wire.Swap(nil); w != nil {
		w.shut() // an abandoned stream is no reason not to open a new one
	}
	l.buf = nil
	l.stale.Store(true)
	ctx, cancel := context.WithCancelCause(ctx)
	defer cancel(nil)
	stop := context.AfterFunc(l.life, func() { cancel(ErrClosed) })
	defer stop()
	rw, err := l.opt.Dial(ctx, l.addr)
	if err != nil {
		return l.fault("reopen", err)
	}
	if l.addr.Scheme != "serial" {
		l.torn.Store(false) // a fragment went down with its connection
	}
	w := newWire(rw, &l.opt)
	l.wire.Store(w)
	if l.ending.Load() { // Close may have looked before the new stream was there
		w.shut()
		return l.fault("reopen", ErrClosed)
	}
	return nil
}
