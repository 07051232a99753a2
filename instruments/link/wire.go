package link

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"time"
)

// abandonAfter bounds the closing of a stream. A write that is stuck in the
// system survives the closing of its descriptor, so the pumps are then left
// behind rather than waited for.
const abandonAfter = 2 * time.Second

// wire is one open stream and its two pumps: one goroutine reads, one writes,
// so that neither a blocked read nor a blocked write can hold up a caller.
type wire struct {
	rw     io.ReadWriteCloser
	opt    *Options
	in     chan []byte   // received, in order; closed by the reader at the end
	out    chan parcel   // lines to send; unbuffered, so what is taken is being written
	stop   chan struct{} // closed by shut
	once   chan struct{} // one token: who takes it shuts
	quit   chan struct{} // closed by the writer at its end
	closed chan struct{} // closed when the stream's own Close is back
	err    error         // why the reader ended; read only after in is closed
	end    error         // what Close said; read only after closed is closed
}

// parcel is one line to write and where to say how it went.
type parcel struct {
	ctx  context.Context // of the sender: where it has ended, nothing is written any more
	data []byte
	done chan error // room for one
}

func newWire(rw io.ReadWriteCloser, opt *Options) *wire {
	w := &wire{
		rw: rw, opt: opt,
		in: make(chan []byte, 64), out: make(chan parcel),
		stop: make(chan struct{}), once: make(chan struct{}, 1), quit: make(chan struct{}), closed: make(chan struct{}),
	}
	w.once <- struct{}{}
	go w.read()
	go w.write()
	return w
}

// read pumps received bytes until the stream ends or is shut. Streams may
// report a time-out of their own as (0, nil): that is no data yet, not an
// end, and is answered by a short pause so that it can't spin.
func (w *wire) read() {
	defer close(w.in)
	buf := make([]byte, 4096)
	for {
		n, err := w.rw.Read(buf)
		if n > 0 && !w.deliver(bytes.Clone(buf[:n])) {
			return
		}
		if err != nil {
			w.err = lost(err)
			if w.isShut() {
				w.err = errShut
			}
			return
		}
		if n == 0 && !w.pause(time.Millisecond) {
			return
		}
	}
}

// deliver hands a chunk on; false when the wire was shut meanwhile.
func (w *wire) deliver(chunk []byte) bool {
	w.trace(In, chunk)
	select {
	case w.in <- chunk:
		return true
	case <-w.stop:
		w.err = errShut
		return false
	}
}

func (w *wire) isShut() bool {
	select {
	case <-w.stop:
		return true
	default:
		return false
	}
}

func (w *wire) pause(d time.Duration) bool {
	select {
	case <-time.After(d):
		return true
	case <-w.stop:
		w.err = errShut
		return false
	}
}

// write pumps lines until the wire is shut.
func (w *wire) write() {
	defer close(w.quit)
	for {
		select {
		case p := <-w.out:
			p.done <- w.put(p)
		case <-w.stop:
			return
		}
	}
}

// put writes one line whole, unless its sender has given up: what was cancelled
// before an output was switched off blindly must not leave after it.
func (w *wire) put(p parcel) error {
	if p.ctx.Err() != nil {
		return fmt.Errorf("%w: %w", errUnsent, ended(p.ctx))
	}
	w.trace(Out, p.data) // first, or a quick reply would stand before its question
	n, err := w.rw.Write(p.data)
	if err == nil && n < len(p.data) {
		err = io.ErrShortWrite
	}
	return lost(err)
}

func (w *wire) trace(dir Direction, data []byte) {
	if w.opt.Trace != nil {
		w.opt.Trace(Event{Time: w.opt.Now(), Dir: dir, Data: data})
	}
}

// errStuck marks a write that was begun and not finished in time: part of the
// line may have left.
var errStuck = errors.New("the line was not taken; flow control may be holding it back")

// errUnsent marks a line of which nothing has left, because its sender gave up first.
var errUnsent = errors.New("nothing was sent")

// errShut marks a stream that was shut on this side, by Close or to be opened
// anew.
var errShut = errors.New("the stream was shut on this side")

// send hands data to the writer and waits until it has left, at most the
// write time-out. Where ctx has ended nothing leaves.
func (w *wire) send(ctx context.Context, data []byte) error {
	if ctx.Err() != nil { // a select between two that are ready takes either
		return fmt.Errorf("%w: %w", errUnsent, ended(ctx))
	}
	late := time.NewTimer(w.opt.WriteTimeout)
	defer late.Stop()
	p := parcel{ctx: ctx, data: data, done: make(chan error, 1)}
	select {
	case w.out <- p:
	case <-w.stop:
		return errShut
	case <-ctx.Done():
		return ended(ctx)
	case <-late.C:
		return fmt.Errorf("%w: an earlier line is still being sent", ErrTimeout)
	}
	select {
	case err := <-p.done:
		return err
	case <-w.stop:
		return fmt.Errorf("%w: %w", errShut, errStuck)
	case <-ctx.Done():
		return fmt.Errorf("%w: %w", ended(ctx), errStuck)
	case <-late.C:
		return fmt.Errorf("%w: %w", ErrTimeout, errStuck)
	}
}

// ended says why a context ended; its deadline counts as a time-out too.
func ended(ctx context.Context) error {
	if errors.Is(ctx.Err(), context.DeadlineExceeded) {
		return fmt.Errorf("%w: %w", ErrTimeout, context.Cause(ctx))
	}
	return context.Cause(ctx)
}

// shut ends both pumps and closes the stream, waiting a bounded time. Calls
// after the first wait for the same end.
func (w *wire) shut() error {
	select {
	case <-w.once:
		close(w.stop)
		go func() {
			defer close(w.closed)
			w.end = w.rw.Close()
		}()
	default:
	}
	limit := time.NewTimer(abandonAfter)
	defer limit.Stop()
	in, quit, closed := w.in, w.quit, w.closed
	for in != nil || quit != nil || closed != nil {
		select {
		case _, more := <-in:
			if !more {
				in = nil
			}
		case <-quit:
			quit = nil
		case <-closed:
			closed = nil
		case <-limit.C:
			return fmt.Errorf("%w: the stream would not end and was abandoned", ErrTimeout)
		}
	}
	return w.end
}
