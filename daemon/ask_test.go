package main

import (
	"context"
	"encoding/json"
	"errors"
	"io"
	"net"
	"net/http"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"nightbench/daemon/app"
	"nightbench/daemon/web"
	"nightbench/instruments/bench"
	"nightbench/instruments/discover"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/link/linktest"
	"nightbench/instruments/scpi"

	"github.com/creack/pty"
)

// onSocket serves a small instrument on a loopback socket and gives its address.
func onSocket(t *testing.T, l *drivertest.Listener) string {
	t.Helper()
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	var all sync.WaitGroup
	all.Go(func() {
		for {
			c, err := ln.Accept()
			if err != nil {
				return
			}
			inside, err := l.Dial(context.Background(), link.Address{})
			if err != nil {
				t.Error(err)
				return
			}
			all.Go(func() { io.Copy(inside, c); inside.Close() })
			all.Go(func() { io.Copy(c, inside); c.Close() })
		}
	})
	t.Cleanup(func() { ln.Close(); all.Wait() })
	return "tcp://" + ln.Addr().String()
}

// command runs nightbench in this process, with what is typed.
func command(t *testing.T, typed string, args ...string) (string, error) {
	t.Helper()
	var out strings.Builder
	root := newRoot(t.Context(), append(args, "--state", t.TempDir()))
	root.SetOut(&out)
	root.SetErr(&out)
	root.SetIn(strings.NewReader(typed))
	err := root.ExecuteContext(t.Context())
	return out.String(), err
}

func TestAskOneQuery(t *testing.T) {
	scope := drivertest.NewScope()
	at := onSocket(t, &scope.Listener)
	if out, err := command(t, "", "ask", at, "*IDN?"); err != nil || out != "Nightbench,practice-scope,T3,1.0\n" {
		t.Errorf("got %q, %v", out, err)
	}
	out, err := command(t, "", "ask", at, "TRAC:COLOUR?", "--timeout", "200ms")
	if !errors.Is(err, link.ErrTimeout) || status(err) != exitFailed || !strings.Contains(out, `error -113,"Undefined header;TRAC:COLOUR?"`) {
		t.Errorf("unknown header: %q, %v", out, err)
	}
	for _, words := range [][]string{{"ask", "COM3", "*IDN?"}, {"ask", at, "*IDN?", "--dialect", "no-such"}, {"ask"}} {
		if _, err := command(t, "", words...); status(err) != exitUsage {
			t.Errorf("%q: %v", words, err)
		}
	}
}

const typedScope = `*IDN?
SENS:SWE:POIN 1000
INIT
*OPC?
TRAC? CH1
FORM WORD
*IDN?;*OPC?

.errors
.identify
.clear
.what
.history
.quit
*RST
`

const saidScope = `Nightbench,practice-scope,T3,1.0
1
block of 2000 bytes: 00 00 00 00 00 00 00 00 00 00 00 00 00 00 00 00 … (each from 0 to 0)
error -224,"Illegal parameter value;WORD"
`

// What was typed and shown is recorded, and the record played back shows the same.
func TestAskLineByLineRecordedAndPlayedBack(t *testing.T) {
	scope := drivertest.NewScope()
	at := onSocket(t, &scope.Listener)
	file := filepath.Join(t.TempDir(), "scope.txt")
	out, err := command(t, typedScope, "ask", at, "--record", file)
	if err != nil || !strings.HasPrefix(out, saidScope) {
		t.Fatalf("%v, shown:\n%s", err, out)
	}
	for _, want := range []string{"send them one at a time", "no such word as .what", "   3  INIT\n", "  12  .history\n"} {
		if !strings.Contains(out, want) {
			t.Errorf("it does not show %q:\n%s", want, out)
		}
	}
	if n := scope.Count("*RST"); n > 0 {
		t.Error("typed after .quit, and sent")
	}
	text, err := os.ReadFile(file)
	if err != nil || !strings.Contains(string(text), "# "+at+"\n> *IDN?\\n\n") || !strings.Contains(string(text), `< #42000\x00\x00`) {
		t.Errorf("%v, recorded:\n%.300s", err, text)
	}

	var again strings.Builder
	l, conn, err := bench.Connect(t.Context(), linktest.Address(t), nil, bench.Options{Dial: linktest.PlaybackFile(t, file)})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if err := converse(t.Context(), &asking{conn: conn, link: l, out: &again}, strings.NewReader(typedScope)); err != nil {
		t.Fatal(err)
	}
	if again.String() != strings.ReplaceAll(out, at, linktest.Address(t).String()) {
		t.Errorf("played back:\n%s\nat first:\n%s", again.String(), out)
	}
}

func TestAskPlainSendsOnlyWhatIsTyped(t *testing.T) {
	meter := drivertest.NewMeter()
	at := onSocket(t, &meter.Listener)
	if out, err := command(t, "FUNC?\n*CLS\n", "ask", at, "--plain"); err != nil || out != "\"VOLT:DC\"\n" {
		t.Errorf("got %q, %v", out, err)
	}
	for deadline := time.Now().Add(5 * time.Second); meter.Count("*CLS") == 0 && time.Now().Before(deadline); {
		time.Sleep(time.Millisecond)
	}
	if got := strings.Join(meter.Received(), " "); got != "FUNC? *CLS" {
		t.Errorf("it was sent %q", got)
	}
}

// On a terminal the arrow key brings the line before back.
func TestAskOnATerminal(t *testing.T) {
	meter := drivertest.NewMeter()
	master, slave, err := pty.Open()
	if err != nil {
		t.Fatal(err)
	}
	defer master.Close()
	l, conn, err := bench.Connect(t.Context(), linktest.Address(t), nil, bench.Options{Dial: meter.Dial})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	go io.Copy(io.Discard, master)
	ended := make(chan error, 1)
	go func() { ended <- converse(t.Context(), &asking{conn: conn, link: l, out: slave}, slave) }()
	for n, keys := range []string{"FUNC?\r", "\x1b[A\r"} {
		io.WriteString(master, keys)
		for deadline := time.Now().Add(10 * time.Second); meter.Count("FUNC?") <= n && time.Now().Before(deadline); {
			time.Sleep(time.Millisecond)
		}
	}
	io.WriteString(master, "\x04")
	if err := <-ended; err != nil || meter.Count("FUNC?") != 2 {
		t.Errorf("%v; asked %q", err, meter.Received())
	}
	slave.Close()
}

func TestSummary(t *testing.T) {
	for _, c := range []struct {
		r    scpi.Reply
		want string
	}{
		{scpi.Reply{Text: "+1.5"}, "+1.5"}, {scpi.Reply{Block: []byte{}}, "block of 0 bytes"},
		{scpi.Reply{Block: []byte{9, 255}}, "block of 2 bytes: 09 ff (each from 9 to 255)"},
	} {
		if got := summary(c.r); got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
}

// A daemon that holds an instrument keeps it for itself.
func TestAskOfWhatADaemonHolds(t *testing.T) {
	dir := t.TempDir()
	ln, err := net.Listen("unix", app.Socket(dir))
	if err != nil {
		t.Fatal(err)
	}
	s := &http.Server{Handler: http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		json.NewEncoder(w).Encode(web.Bench{Instruments: []web.Instrument{{Name: "supply", Address: "tcp://192.0.2.10:05025"}}})
	})}
	go s.Serve(ln)
	defer s.Close()
	c := &cli{state: dir}
	a, err := link.Parse("tcp://192.0.2.10:5025")
	if err != nil {
		t.Fatal(err)
	}
	if err := c.notHeld(t.Context(), a); err == nil || !strings.Contains(err.Error(), "holds tcp://192.0.2.10:5025 as its supply") {
		t.Errorf("got %v", err)
	}
	if a, err = link.Parse("tcp://192.0.2.10:5026"); err != nil || c.notHeld(t.Context(), a) != nil {
		t.Errorf("another address: %v", c.notHeld(t.Context(), a))
	}
}

func TestPortsAsksWhereItIsAskedTo(t *testing.T) {
	meter := drivertest.NewMeter()
	at := onSocket(t, &meter.Listener)
	out, err := command(t, "", "ports", "--at", at)
	if err != nil || !strings.Contains(out, at+"\n    given\n") || !strings.Contains(out, "nobody was asked") || len(meter.Received()) > 0 {
		t.Errorf("%v, it was sent %q:\n%s", err, meter.Received(), out)
	}
	out, err = command(t, "", "ports", "--at", at, "--ask")
	want := at + "\n    given\n    answers Nightbench,practice-meter,T2,1.0\n    for a bench file:\n        [[meter]]\n        address = \"" + at + "\"\n        dialect = \"standard-meter\"\n        serial = \"T2\"\n"
	if err != nil || out != want {
		t.Errorf("%v, shown:\n%s", err, out)
	}
	out, err = command(t, "", "ports", "--at", at, "--ask", "--json")
	var found []discover.Found
	if e := json.Unmarshal([]byte(out), &found); err != nil || e != nil || len(found) != 1 || found[0].Dialect != "standard-meter" {
		t.Errorf("%v, %v: %s", err, e, out)
	}
	out, err = command(t, "", "ports", "--at", "serial:///dev/ttyS77", "--dialect", "nightbench-pot")
	if err != nil || !strings.HasPrefix(out, "serial:///dev/ttyS77?baud=115200\n") {
		t.Errorf("%v: %s", err, out)
	}
	if out, err = command(t, "", "ports", "--udev"); err != nil || !strings.Contains(out, `KERNEL=="usbtmc*", GROUP="dialout"`) {
		t.Errorf("%v: %s", err, out)
	}
	if _, err = command(t, "", "ports", "--at", "COM3"); status(err) != exitUsage {
		t.Errorf("got %v", err)
	}
}
