package linktest

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"sync"
	"time"

	"nightbench/instruments/link"
)

// pauseWorth is the shortest silence before a reply that Record writes down.
const pauseWorth = 50 * time.Millisecond

// Record wraps a way of opening streams: what passes is written to w as an
// exchange log that Playback can replay. With dial nil the address is opened
// as a link would open it.
func Record(dial link.Dial, w io.Writer) link.Dial {
	if dial == nil {
		dial = link.DialAddress
	}
	return func(ctx context.Context, a link.Address) (io.ReadWriteCloser, error) {
		rw, err := dial(ctx, a)
		if err != nil {
			return nil, err
		}
		r := &recorder{ReadWriteCloser: rw, w: w, last: time.Now()}
		r.note("# %s\n", a)
		return r, nil
	}
}

// recorder copies what passes into a log. The mutex guards all fields below
// it and is held only while a line is written to the log.
type recorder struct {
	io.ReadWriteCloser
	mu   sync.Mutex
	w    io.Writer
	last time.Time
	in   []byte // received, not yet a whole line
	err  error  // the first failure to write the log
}

func (r *recorder) Read(p []byte) (int, error) {
	n, err := r.ReadWriteCloser.Read(p)
	r.mu.Lock()
	defer r.mu.Unlock()
	if n > 0 {
		if pause := time.Since(r.last).Round(10 * time.Millisecond); len(r.in) == 0 && pause >= pauseWorth {
			r.print(". %s\n", pause)
		}
		r.last = time.Now()
		r.in = append(r.in, p[:n]...)
		r.lines()
	}
	return n, err
}

// lines writes the whole lines received so far, each with its terminators.
func (r *recorder) lines() {
	for {
		end := bytes.IndexByte(r.in, '\n')
		if end < 0 && len(r.in) < 1024 {
			return
		}
		if end < 0 {
			end = len(r.in) - 1
		}
		r.print("< %s\n", escape(r.in[:end+1]))
		r.in = r.in[end+1:]
	}
}

// flush writes what was received without an end.
func (r *recorder) flush() {
	if len(r.in) > 0 {
		r.print("< %s\n", escape(r.in))
		r.in = nil
	}
}

func (r *recorder) Write(p []byte) (int, error) {
	r.mu.Lock()
	r.flush()
	r.print("> %s\n", escape(p))
	r.last = time.Now()
	r.mu.Unlock()
	return r.ReadWriteCloser.Write(p)
}

// Close also reports the first failure to write the log.
func (r *recorder) Close() error {
	err := r.ReadWriteCloser.Close()
	r.mu.Lock()
	defer r.mu.Unlock()
	r.flush()
	if err == nil {
		err = r.err
	}
	return err
}

func (r *recorder) note(format string, args ...any) {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.print(format, args...)
}

func (r *recorder) print(format string, args ...any) {
	if _, err := fmt.Fprintf(r.w, format, args...); r.err == nil {
		r.err = err
	}
}
