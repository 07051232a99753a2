package scpi

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"net"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"pgregory.net/rapid"

	"nightbench/instruments/link"
)

func newLines(r io.Reader) *bufio.Scanner { return bufio.NewScanner(r) }

// slow is an instrument that answers in order, each query after its own
// delay, counting the questions so that an answer names its question.
// It runs until the pipe is closed and wait returns.
func slow(c net.Conn, delay func(query string, n int) time.Duration) (wait func()) {
	over := make(chan struct{})
	go func() { defer close(over); answer(c, delay) }()
	return func() { c.Close(); <-over }
}

func answer(c net.Conn, delay func(query string, n int) time.Duration) {
	in := newLines(c)
	type reply struct {
		text string
		due  time.Time
	}
	todo := make(chan reply, 1000)
	done := make(chan struct{})
	go func() {
		defer close(done)
		for a := range todo {
			time.Sleep(time.Until(a.due))
			if _, err := io.WriteString(c, a.text); err != nil {
				return
			}
		}
	}()
	free := time.Now()
	for n := 0; in.Scan(); n++ {
		text := map[string]string{"*IDN?": self, "*OPC?": "1"}[in.Text()]
		if text == "" {
			text = fmt.Sprint(strings.TrimSuffix(in.Text(), "?")[1:]) // Q17? is answered by 17
		}
		if free.Before(time.Now()) {
			free = time.Now()
		}
		free = free.Add(delay(in.Text(), n))
		todo <- reply{text + "\n", free}
	}
	close(todo)
	<-done
}

// A reply delayed past the time-out is never given to the next query.
func TestLateReplyIsDiscarded(t *testing.T) {
	for _, late := range []time.Duration{1050, 1099, 1100, 1101, 1500, 2050, 2100, 2101, 3500, 5000} {
		synctest.Test(t, func(t *testing.T) {
			ours, theirs := net.Pipe()
			wait := slow(theirs, func(q string, _ int) time.Duration {
				if q == "Q1?" {
					return late * time.Millisecond
				}
				return 0
			})
			c := overPipe(t, ours, Options{})
			if _, err := c.Query(t.Context(), "Q1?"); !errors.Is(err, link.ErrTimeout) || c.InStep() {
				t.Errorf("%d ms: first %v, in step %v; want a time-out", late, err, c.InStep())
			}
			got, err := c.Query(t.Context(), "Q2?")
			if errors.Is(err, ErrOutOfStep) { // not asked at all: the instrument was still busy
				got, err = c.Query(t.Context(), "Q2?")
			}
			if err != nil || got != "2" {
				t.Errorf("%d ms: second %q, %v; want 2", late, got, err)
			}
			wait()
		})
	}
}

// Late replies that look like the proof's own must not pass: the marker or
// identity query itself is the one that was late.
func TestLateReplyThatLooksAlike(t *testing.T) {
	for _, late := range []string{"*OPC?", "*IDN?"} {
		for ms := 900; ms < 5000; ms += 130 {
			synctest.Test(t, func(t *testing.T) {
				ours, theirs := net.Pipe()
				first := true
				wait := slow(theirs, func(q string, n int) time.Duration {
					if q == late && n > 2 && first { // the proof at the start is n = 0, 1
						first = false
						return time.Duration(ms) * time.Millisecond
					}
					return 0
				})
				c := overPipe(t, ours, Options{})
				c.Query(t.Context(), "Q1?")
				c.Query(t.Context(), late) // times out, or not quite
				for i := 2; i < 5; i++ {
					want := fmt.Sprint(i)
					if got, err := c.Query(t.Context(), "Q"+want+"?"); err == nil && got != want {
						t.Errorf("%s %d ms late: Q%s? answered with %q", late, ms, want, got)
					}
				}
				wait()
			})
		}
	}
}

// Whatever the delays, a query gets its own answer or an error.
func TestNeverAnothersAnswer(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		delays := rapid.SliceOfN(rapid.IntRange(0, 2600), 40, 40).Draw(rt, "delays")
		calm := rapid.IntRange(0, 3).Draw(rt, "calm") // of four answers, how many come at once
		var wrong string
		right := 0
		synctest.Test(t, func(t *testing.T) {
			ours, theirs := net.Pipe()
			wait := slow(theirs, func(_ string, n int) time.Duration {
				if n%4 < calm || n >= len(delays) {
					return 0
				}
				return time.Duration(delays[n]) * time.Millisecond
			})
			c := overPipe(t, ours, Options{})
			for i := range 12 {
				query := fmt.Sprintf("Q%d?", i)
				if i%5 == 2 {
					query = "*OPC?"
				}
				got, err := c.Query(t.Context(), query)
				if err != nil {
					continue
				}
				right++
				if want := map[bool]string{true: "1", false: fmt.Sprint(i)}[query == "*OPC?"]; got != want {
					wrong = fmt.Sprintf("%s answered with %q", query, got)
				}
			}
			wait()
		})
		if wrong != "" {
			rt.Fatal(wrong)
		}
		if right == 0 && calm == 3 {
			rt.Fatal("never an answer")
		}
	})
}

func TestBlindInTheMiddleSpoilsTheExchange(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		got := make(chan string, 8)
		go func() {
			in := newLines(theirs)
			for in.Scan() {
				got <- in.Text()
				switch in.Text() {
				case "*IDN?":
					io.WriteString(theirs, self+"\n")
				case "*OPC?":
					io.WriteString(theirs, "1\n")
				case "READ?":
					time.AfterFunc(800*time.Millisecond, func() { io.WriteString(theirs, "1.5\n") })
				}
			}
		}()
		c := overPipe(t, ours, Options{})
		result := make(chan error, 1)
		go func() { _, err := c.Query(t.Context(), "READ?"); result <- err }()
		time.Sleep(500 * time.Millisecond)
		start := time.Now()
		if err := c.Blind(t.Context(), "OUTP OFF"); err != nil || time.Since(start) != 0 {
			t.Errorf("blind: %v after %v, want at once", err, time.Since(start))
		}
		if err := <-result; !errors.Is(err, ErrInterrupted) {
			t.Errorf("the exchange: %v, want ErrInterrupted", err)
		}
		for _, want := range []string{"*IDN?", "*OPC?", "READ?", "OUTP OFF"} {
			if s := <-got; s != want {
				t.Errorf("the instrument got %q, want %q", s, want)
			}
		}
		if err := c.Resync(t.Context()); err != nil || !c.InStep() {
			t.Errorf("resync: %v", err)
		}
		theirs.Close()
	})
}

func TestSilentInstrumentIsBounded(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		go io.Copy(io.Discard, theirs)
		c := overPipe(t, ours, Options{})
		start := time.Now()
		_, err := c.Query(t.Context(), "VOLT?")
		if !errors.Is(err, ErrOutOfStep) || !errors.Is(err, link.ErrTimeout) {
			t.Errorf("got %v", err)
		}
		if d := time.Since(start); d > 20*time.Second {
			t.Errorf("took %v", d)
		}
		if err := c.Blind(t.Context(), "OUTP OFF"); err != nil {
			t.Errorf("blind: %v", err)
		}
		theirs.Close()
	})
}
