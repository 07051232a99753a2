package exchange

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
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		go func() {
			b := make([]byte, 2)
			io.ReadFull(theirs, b)
			time.Sleep(70 * time.Millisecond)
			io.WriteString(theirs, "#15\x00\n\\ \xff\r\n")
			io.ReadFull(theirs, b)
			io.WriteString(theirs, "no end")
		}()
		var text strings.Builder
		log := NewLog(&text, "a scope")
		a, err := link.Parse("tcp://playback.invalid:5025")
		if err != nil {
			t.Fatal(err)
		}
		l, err := link.Open(t.Context(), a, link.Options{Trace: log.Trace, Timeout: time.Second,
			Dial: func(context.Context, link.Address) (io.ReadWriteCloser, error) { return ours, nil }})
		if err != nil {
			t.Fatal(err)
		}
		for _, line := range []string{"A", "B"} {
			if err := l.Send(t.Context(), line); err != nil {
				t.Fatal(err)
			}
			time.Sleep(time.Second)
		}
		l.Close()
		theirs.Close()
		if err := log.Close(); err != nil {
			t.Fatal(err)
		}
		const want = `# a scope
> A\n
. 70ms
< #15\x00\n
< \\ \xff\r\n
> B\n
< no end
`
		if text.String() != want {
			t.Errorf("recorded\n%swant\n%s", text.String(), want)
		}
		if err := script(t, text.String(), "A\nB\n"); err != nil {
			t.Errorf("played back: %v", err)
		}
	})
}

// broken is a disk that is full.
type broken struct{}

func (broken) Write([]byte) (int, error) { return 0, errors.New("disk full") }

func TestLogThatCannotBeWritten(t *testing.T) {
	if err := NewLog(broken{}, "x").Close(); err == nil || err.Error() != "disk full" {
		t.Errorf("got %v", err)
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
