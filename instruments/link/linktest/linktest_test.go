package linktest

import (
	"context"
	"errors"
	"io"
	"net"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"
	"pgregory.net/rapid"

	"nightbench/instruments/link"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

const meterLog = `
# a meter asked twice, the second time slow
> *IDN?\n
< PUMPWORKS,M-6,0,1.0\r\n
> READ?\n
. 2s
< +1.25000000E+00\r\n
! lost
> READ?\n
< \x2b1.5\n
`

func TestPlaybackFollowsTheLog(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l := Open(t, meterLog, link.Options{})
		start := time.Now()
		for _, c := range [][2]string{{"*IDN?", "PUMPWORKS,M-6,0,1.0"}, {"READ?", "+1.25000000E+00"}} {
			if got, err := l.Query(t.Context(), c[0]); err != nil || got != c[1] {
				t.Errorf("%s: %q, %v", c[0], got, err)
			}
		}
		if d := time.Since(start); d != 2*time.Second {
			t.Errorf("took %v, want the 2 s of the log", d)
		}
		synctest.Wait()
		if _, err := l.Query(t.Context(), "READ?"); !errors.Is(err, link.ErrLost) {
			t.Errorf("after the end: %v, want ErrLost", err)
		}
		if err := l.Reopen(t.Context()); err != nil {
			t.Fatal(err)
		}
		if got, err := l.Query(t.Context(), "READ?"); err != nil || got != "+1.5" {
			t.Errorf("after reopening: %q, %v", got, err)
		}
		l.Close()
	})
}

// script runs a playback against what a program sends and gives its verdict.
func script(t *testing.T, log, sends string) error {
	t.Helper()
	steps, err := Parse(strings.NewReader(log))
	if err != nil {
		t.Fatal(err)
	}
	p := NewPlay(steps)
	c, err := p.Dial(t.Context(), link.Address{})
	if err != nil {
		t.Fatal(err)
	}
	go io.Copy(io.Discard, c)
	for _, line := range strings.SplitAfter(sends, "\n") {
		io.WriteString(c, line)
	}
	c.Close()
	return p.Err()
}

func TestPlaybackNotices(t *testing.T) {
	for _, c := range []struct{ name, log, sends, says string }{
		{"Departure", `> OUTP OFF\n`, "OUTP ON \n", `expected "OUTP OFF\n", was sent "OUTP ON \n"`},
		{"Unused", "> A\\n\n> B\\n", "A\n", `line 2 never happened: > "B\n"`},
		{"Surplus", `> A\n`, "A\nB\n", `at its end, yet "B\n" was sent`},
		{"Half", `> ABC\n`, "AB", `was sent "AB"`},
		{"Nothing", `> A\n`, "A\n", ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			err := script(t, c.log, c.sends)
			if (err == nil) != (c.says == "") || err != nil && !strings.Contains(err.Error(), c.says) {
				t.Errorf("verdict %v, want %q", err, c.says)
			}
		})
	}
}

func TestRecordThenPlay(t *testing.T) {
	var log strings.Builder
	ours, theirs := net.Pipe()
	go func() {
		b := make([]byte, 2)
		io.ReadFull(theirs, b)
		io.WriteString(theirs, "#15\x00\n\\ \xff\r\n")
		io.ReadFull(theirs, b)
		io.WriteString(theirs, "no end")
		theirs.Close()
	}()
	dial := Record(func(context.Context, link.Address) (io.ReadWriteCloser, error) { return ours, nil }, &log)
	c, err := dial(t.Context(), Address(t))
	if err != nil {
		t.Fatal(err)
	}
	io.WriteString(c, "A\n")
	io.ReadFull(c, make([]byte, 10))
	io.WriteString(c, "B\n")
	io.Copy(io.Discard, c)
	c.Close()
	const want = `# tcp://playback.invalid:5025
> A\n
< #15\x00\n
< \\ \xff\r\n
> B\n
< no end
`
	if log.String() != want {
		t.Errorf("recorded\n%swant\n%s", log.String(), want)
	}
	if err := script(t, log.String(), "A\nB\n"); err != nil {
		t.Errorf("played back: %v", err)
	}
}

func TestParseRefuses(t *testing.T) {
	for _, text := range []string{">*IDN?", "? x", `< \q`, `< \x1`, `< \xzz`, `< \`, ". soon", "! gone"} {
		if _, err := Parse(strings.NewReader("# head\n" + text)); err == nil || !strings.Contains(err.Error(), "line 2") {
			t.Errorf("%q: %v, want an error naming line 2", text, err)
		}
	}
}

func TestEscapeRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		data := rapid.SliceOf(rapid.Byte()).Draw(t, "data")
		text := escape(data)
		back, err := unescape(text)
		if err != nil || string(back) != string(data) {
			t.Fatalf("%q → %q → %q, %v", data, text, back, err)
		}
		if strings.TrimSpace("> "+text+"x") != "> "+text+"x" || strings.ContainsAny(text, "\n\r") {
			t.Fatalf("%q does not survive as a line of text", text)
		}
	})
}
