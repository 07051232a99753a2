package scpi

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

	"nightbench/instruments/link"
	"nightbench/instruments/link/linktest"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

const self = "PUMPWORKS,PS-1,0,1.0"

// inStep is how a log begins: the first exchange proves step.
const inStep = "> *IDN?\\n\n< " + self + "\\n\n> *OPC?\\n\n< 1\\n\n"

// play opens a connection on a log. It must be used inside a synctest bubble,
// so that quiet times cost nothing.
func play(t *testing.T, log string, opt Options) *Conn {
	t.Helper()
	return New(linktest.Open(t, log, link.Options{Timeout: time.Second}), opt)
}

func TestFirstExchangeProvesStep(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, inStep+"> VOLT?\\n\n< +5.00000000E+00\\r\\n\n> VOLT 0.005\\n", Options{})
		if c.InStep() {
			t.Error("in step before anything was proven")
		}
		if n, err := c.QueryNumber(t.Context(), "VOLT?"); err != nil || n.Value != 5 || n.Raw != "+5.00000000E+00" {
			t.Errorf("got %+v, %v", n, err)
		}
		if err := c.Write(t.Context(), "VOLT "+FormatNumber(0.005)); err != nil || !c.InStep() {
			t.Errorf("write: %v, in step %v", err, c.InStep())
		}
	})
}

func TestMessagesAreRefused(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, "", Options{})
		for _, bad := range []string{"", " ", "VOLT 5;CURR 1", "VOLT 5\n", "VOLT?"} {
			if err := c.Write(t.Context(), bad); !errors.Is(err, ErrMessage) {
				t.Errorf("Write(%q): %v, want ErrMessage", bad, err)
			}
		}
		for _, bad := range []string{"VOLT", "VOLT?;CURR?", `DISP "?"`} {
			if _, err := c.Query(t.Context(), bad); !errors.Is(err, ErrMessage) {
				t.Errorf("Query(%q): %v, want ErrMessage", bad, err)
			}
		}
	})
}

func TestSemicolonInsideAString(t *testing.T) {
	if err := checkMessage(`DISP:TEXT "a;b?"`, false); err != nil {
		t.Error(err)
	}
}

func TestTypedReplies(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, inStep+`
> OUTP?\n
< ON\n
> FUNC?\n
< "VOLT:DC ""x"""\n
> MEAS:VOLT?\n
< 5.00V\n
`+inStep+`
> CURR?\n
< 0\n
`, Options{})
		if b, err := c.QueryBool(t.Context(), "OUTP?"); err != nil || !b {
			t.Errorf("bool %v, %v", b, err)
		}
		if s, err := c.QueryString(t.Context(), "FUNC?"); err != nil || s != `VOLT:DC "x"` {
			t.Errorf("string %q, %v", s, err)
		}
		if n, err := c.QueryNumber(t.Context(), "MEAS:VOLT?"); !errors.Is(err, ErrForm) || n.Raw != "5.00V" || c.InStep() {
			t.Errorf("a unit nobody allowed: %+v, %v; in step %v", n, err, c.InStep())
		}
		if n, err := c.QueryNumber(t.Context(), "CURR?"); err != nil || n.Value != 0 {
			t.Errorf("after it: %+v, %v", n, err)
		}
	})
}

func TestStraysAreNotAnswers(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		go scripted(theirs, map[string]string{"VOLT?": "5\n"})
		var seen []Exchange
		c := overPipe(t, ours, Options{OnExchange: func(e Exchange) { seen = append(seen, e) }})
		if _, err := c.Query(t.Context(), "VOLT?"); err != nil {
			t.Fatal(err)
		}
		go io.WriteString(theirs, "9\n") // another client's answer
		time.Sleep(time.Second)
		if got, err := c.Query(t.Context(), "VOLT?"); err != nil || got != "5" {
			t.Errorf("got %q, %v; want 5", got, err)
		}
		if last := seen[len(seen)-3]; last.Strays != "9\n" || !last.Proof {
			t.Errorf("the stray was not reported: %+v", seen)
		}
		theirs.Close()
	})
}

func TestTwoLinesAreNoAnswer(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, inStep+"> VOLT?\\n\n< 4\\n5\\n\n", Options{})
		if got, err := c.Query(t.Context(), "VOLT?"); !errors.Is(err, ErrFraming) || got != "" {
			t.Errorf("got %q, %v; want ErrFraming", got, err)
		}
	})
}

func TestEchoAndGap(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, strings.NewReplacer("> *IDN?\\n", "> *IDN?\\n\n< *IDN?\\r\\n", "> *OPC?\\n", "> *OPC?\\n\n< *OPC?\\r\\n").Replace(inStep)+
			"> VOLT 5\\n\n< VOLT 5\\r\\n\n> VOLT?\\n\n< VOLT?\\r\\n5\\r\\n", Options{Echo: true, Gap: 300 * time.Millisecond})
		if err := c.Write(t.Context(), "VOLT 5"); err != nil {
			t.Fatal(err)
		}
		start := time.Now()
		if got, err := c.Query(t.Context(), "VOLT?"); err != nil || got != "5" {
			t.Errorf("got %q, %v", got, err)
		}
		if d := time.Since(start); d != 300*time.Millisecond {
			t.Errorf("gap %v, want 300 ms", d)
		}
	})
}

func TestIdentify(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, "> *IDN?\\n\n< "+self+"\\n\n> *IDN?\\n\n< "+self+"\\n\n", Options{})
		id, err := c.Identify(t.Context())
		if err != nil || id.Maker != "PUMPWORKS" || id.Model != "PS-1" || id.Raw != self {
			t.Errorf("got %+v, %v", id, err)
		}
		if c.InStep() {
			t.Error("identifying is no proof of step")
		}
	})
}

func TestAnotherInstrumentIsRefused(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		go scripted(theirs, map[string]string{"VOLT?": "5\n"})
		c := overPipe(t, ours, Options{Identity: "PUMPWORKS,PS-2,0,1.0"})
		_, err := c.Query(t.Context(), "VOLT?")
		if !errors.Is(err, ErrOther) || !errors.Is(err, ErrOutOfStep) {
			t.Errorf("got %v, want ErrOther", err)
		}
		theirs.Close()
	})
}

func TestWithinAllowsASlowReading(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, inStep+"> READ?\\n\n. 8s\n< 1.5\\n", Options{})
		if n, err := c.Within(10*time.Second).QueryNumber(t.Context(), "READ?"); err != nil || n.Value != 1.5 {
			t.Errorf("got %+v, %v", n, err)
		}
	})
}

// overPipe opens a connection on one end of a pipe.
func overPipe(t *testing.T, ours net.Conn, opt Options) *Conn {
	t.Helper()
	l, err := link.Open(t.Context(), serialAddress(t), link.Options{Timeout: time.Second, Dial: func(context.Context, link.Address) (io.ReadWriteCloser, error) {
		return ours, nil
	}})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return New(l, opt)
}

// serialAddress is an address whose link is not opened anew by itself.
func serialAddress(t *testing.T) link.Address {
	t.Helper()
	a, err := link.Parse("serial:///dev/ttyPLAYBACK")
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// scripted answers queries by a table, and *IDN? and *OPC? of its own.
func scripted(c net.Conn, replies map[string]string) {
	in := newLines(c)
	for in.Scan() {
		switch q := in.Text(); q {
		case "*IDN?":
			io.WriteString(c, self+"\n")
		case "*OPC?":
			io.WriteString(c, "1\n")
		default:
			io.WriteString(c, replies[q])
		}
	}
}
