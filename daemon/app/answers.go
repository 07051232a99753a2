package app

import (
	"context"
	"errors"
	"sync"
	"time"

	"nightbench/instruments/bench"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// answers keeps how each instrument answered last, for the margin of the page.
type answers struct {
	mu    sync.Mutex
	order []string
	last  map[string]string
}

// expect fixes the order and what is said before the first exchange.
func (a *answers) expect(info []bench.Info) {
	a.mu.Lock()
	defer a.mu.Unlock()
	a.order = nil
	for _, i := range info {
		a.order = append(a.order, i.Name)
	}
}

// hear takes one exchange. It is called from the goroutine of the link.
func (a *answers) hear(instrument string, e scpi.Exchange) {
	if cutShort(e.Err) {
		return
	}
	words := "answers in " + si.Format(roundly(e.Elapsed).Seconds(), si.Second)
	if e.Err != nil {
		words = "does not answer: " + e.Err.Error()
	}
	a.mu.Lock()
	defer a.mu.Unlock()
	if a.last == nil {
		a.last = map[string]string{}
	}
	a.last[instrument] = words
}

// cutShort tells whether an exchange failed because the run ended, not because of the instrument.
func cutShort(err error) bool {
	var stop *runner.Stop
	var trip *runner.Trip
	return errors.Is(err, context.Canceled) || errors.As(err, &stop) || errors.As(err, &trip)
}

// all is a line an instrument, in the order of the bench.
func (a *answers) all() []sweeps.Answering {
	a.mu.Lock()
	defer a.mu.Unlock()
	lines := []sweeps.Answering{}
	for _, name := range a.order {
		words, ok := a.last[name]
		if !ok {
			words = "not asked yet"
		}
		lines = append(lines, sweeps.Answering{Name: name, Words: words})
	}
	return lines
}

// roundly leaves milliseconds where there are some, else microseconds.
func roundly(d time.Duration) time.Duration {
	if d >= 2*time.Millisecond {
		return d.Round(time.Millisecond)
	}
	return d.Round(10 * time.Microsecond)
}
