package exchange

import (
	"bytes"
	"fmt"
	"io"
	"sync"
	"time"

	"nightbench/instruments/link"
)

// pauseWorth is the shortest silence before a reply that is written down.
const pauseWorth = 50 * time.Millisecond

// Log writes what passes a link as an exchange log that can be played back.
// Its Trace goes into link.Options; Close it after the link.
type Log struct {
	mu   sync.Mutex // guards what follows; held only while a line is written
	w    io.Writer
	last time.Time
	in   []byte // received, not yet a whole line
	err  error  // the first failure to write
}

// NewLog begins a log with a comment, such as an address.
func NewLog(w io.Writer, comment string) *Log {
	l := &Log{w: w}
	l.print("# %s\n", comment)
	return l
}

// Trace writes one event down.
func (l *Log) Trace(e link.Event) {
	l.mu.Lock()
	defer l.mu.Unlock()
	if e.Dir == link.Out {
		l.flush()
		l.print("> %s\n", escape(e.Data))
		l.last = e.Time
		return
	}
	if pause := e.Time.Sub(l.last).Round(10 * time.Millisecond); len(l.in) == 0 && pause >= pauseWorth && !l.last.IsZero() {
		l.print(". %s\n", pause)
	}
	l.last = e.Time
	l.in = append(l.in, e.Data...)
	l.lines()
}

// lines writes the whole lines received so far, each with its terminators.
func (l *Log) lines() {
	for {
		end := bytes.IndexByte(l.in, '\n')
		if end < 0 && len(l.in) < 1024 {
			return
		}
		if end < 0 {
			end = len(l.in) - 1
		}
		l.print("< %s\n", escape(l.in[:end+1]))
		l.in = l.in[end+1:]
	}
}

// flush writes what was received without an end.
func (l *Log) flush() {
	if len(l.in) > 0 {
		l.print("< %s\n", escape(l.in))
		l.in = nil
	}
}

// Close writes what is left and reports the first failure to write.
func (l *Log) Close() error {
	l.mu.Lock()
	defer l.mu.Unlock()
	l.flush()
	return l.err
}

func (l *Log) print(format string, args ...any) {
	if _, err := fmt.Fprintf(l.w, format, args...); l.err == nil {
		l.err = err
	}
}
