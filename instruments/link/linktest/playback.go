// Package linktest plays exchange logs back as instruments, for tests.
package linktest

import (
	"context"
	"os"
	"strings"
	"testing"

	"nightbench/instruments/link"
	"nightbench/instruments/link/exchange"
)

// Playback replays a log for a test, and fails the test if a line of the log
// is unused or something else is sent. Close the link before the test ends.
func Playback(tb testing.TB, log string) link.Dial {
	tb.Helper()
	steps, err := exchange.Parse(strings.NewReader(log))
	if err != nil {
		tb.Fatal(err)
	}
	p := exchange.NewPlay(steps)
	tb.Cleanup(func() {
		if err := p.Err(); err != nil {
			tb.Error(err)
		}
	})
	return p.Dial
}

// PlaybackFile is Playback of a log in a file.
func PlaybackFile(tb testing.TB, path string) link.Dial {
	tb.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		tb.Fatal(err)
	}
	return Playback(tb, string(text))
}

// Open opens a link on a playback of log and closes it when the test ends.
func Open(tb testing.TB, log string, opt link.Options) *link.Link {
	tb.Helper()
	opt.Dial = Playback(tb, log)
	l, err := link.Open(context.Background(), Address(tb), opt)
	if err != nil {
		tb.Fatal(err)
	}
	tb.Cleanup(func() { l.Close() }) // before the playback is asked, since cleanups run last first
	return l
}

// Address is a well-formed address for a link whose stream is dialled by the
// test itself.
func Address(tb testing.TB) link.Address {
	tb.Helper()
	a, err := link.Parse("tcp://playback.invalid:5025")
	if err != nil {
		tb.Fatal(err)
	}
	return a
}
