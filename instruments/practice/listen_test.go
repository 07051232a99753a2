package practice

import (
	"errors"
	"io"
	"net"
	"os"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"nightbench/instruments"
)

// The NL within a block is data, not an end (IEEE 488.2 7.7.6, from memory; SCPI-1999
// volume 1, 8.5): one message, one error, and the message after it is heard whole.
func TestBlockInAMessage(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.tell("supply", "VOLT #15\n\n*RS;VOLT 3")
		if e := d.ask("supply", "SYST:ERR?"); !strings.HasPrefix(e, "-168,") && !strings.HasPrefix(e, "-104,") {
			t.Errorf("a block where a number belongs: %s", e)
		}
		if e := d.ask("supply", "SYST:ERR?"); !strings.HasPrefix(e, "0,") {
			t.Errorf("a second error: %s", e)
		}
		if v := d.number("supply", "VOLT?"); v != 0 {
			t.Errorf("VOLT? %g: what follows a command error is dropped", v)
		}
	})
}

// A message beyond the input buffer is thrown away up to its NL and queues -363; the next one is heard.
func TestMessageTooLong(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		for _, name := range []string{"supply", "average", "scope", "pot"} {
			d.tell(name, "*CLS;"+strings.Repeat(" ", mostMessage)+"*IDN?")
			if e := d.ask(name, "SYST:ERR?"); !strings.HasPrefix(e, "-363,") {
				t.Errorf("%s: %s", name, e)
			}
			if who := d.ask(name, "*IDN?"); !strings.HasPrefix(who, "Nightbench,practice-") {
				t.Errorf("%s: then *IDN? %q", name, who)
			}
		}
	})
}

// Bytes may come one by one, or several messages at once.
func TestBytesInAnyPortion(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		for _, c := range []byte("VOLT 5\r\nVOL") {
			if _, err := d.lines["supply"].Write([]byte{c}); err != nil {
				t.Fatal(err)
			}
		}
		if got := d.number("supply", "T?\nVOLT 6"); got != 5 {
			t.Errorf("VOLT? %g", got)
		}
		if got := d.number("supply", "VOLT?"); got != 6 {
			t.Errorf("VOLT? %g", got)
		}
	})
}

// Two instruments look at one board at once: both means are of the same wave, and
// the answers come after one aperture and its auto-zero, not after two.
func TestTwoLookAtOnce(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		for _, name := range []string{"average", "motor"} {
			d.tell(name, map[string]string{"average": "VOLT", "motor": "CURR"}[name]+":NPLC 10")
		}
		d.tell("average", "VOLT:RANG 10")
		d.tell("motor", "CURR:RANG 0.1")
		began := d.clock.Elapsed()
		d.tell("average", "READ?")
		d.tell("motor", "READ?")
		volts, amperes := d.number("average", ""), d.number("motor", "")
		if took := d.clock.Elapsed() - began; took < 400*time.Millisecond || took > 500*time.Millisecond {
			t.Errorf("two readings of 10 PLC and their auto-zero side by side took %s; 0.4 s is right at 50 Hz", took)
		}
		d.near("volts by ohm's law", volts, 100*amperes, 5e-3)
	})
}

// Closing ends what clients wait for, at once, whether an answer was due or nobody reads.
func TestCloseWhileClientsWait(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.tell("scope", "TRIG:SOUR CH1;LEV 99;:INIT")
		d.tell("scope", "*OPC?") // never
		d.tell("average", "VOLT:NPLC 100")
		d.tell("average", "READ?")
		d.tell("supply", "*IDN?") // and nobody reads it
		began := time.Now()
		if err := d.Close(); err != nil {
			t.Error(err)
		}
		if took := time.Since(began); took > patience {
			t.Errorf("closing took %s", took)
		}
		if got := d.hear("average", time.Second); got != "" {
			t.Errorf("after the end came %q", got)
		}
	})
}

// A conversation by hand over a real pseudo-terminal, errors included.
func TestByHandOverAPseudoTerminal(t *testing.T) {
	b, err := New(Config{Board: steady(), Clock: instruments.NewClock(50), Seed: 1, Pot: Pot{Codes: 257, Track: 100e3, Wiper: 75, Start: 128}})
	if err != nil {
		t.Fatal(err)
	}
	defer b.Close()
	for _, i := range b.Instruments() {
		address, err := i.ServePTY()
		if err != nil {
			t.Fatal(err)
		}
		f, err := os.OpenFile(strings.TrimPrefix(address, "serial://"), os.O_RDWR, 0)
		if err != nil {
			t.Fatal(err)
		}
		if err := f.SetReadDeadline(time.Now().Add(5 * time.Second)); err != nil {
			t.Fatal(err)
		}
		say := map[string][]string{
			"supply": {"*idn?", "Nightbench,practice-supply,PS-1,1.0", "volt 5;volt?", "+5.00000000E+00", "VOLT 99;:SYST:ERR?", `-222,"Data out of range`, "OUTP?", "0"},
			"pot":    {"*IDN?", "Nightbench,practice-pot,PB-1,1.0", "WIP 7;WIP?", "7", "WIP 300;:SYST:ERR?", `-222,"Data out of range`, "wiper:pow?", "1"},
		}[i.Name]
		for k := 0; k < len(say); k += 2 {
			if _, err := f.WriteString(say[k] + "\r\n"); err != nil {
				t.Fatal(err)
			}
			if got := line(t, f); !strings.HasPrefix(got, say[k+1]) {
				t.Errorf("%s: %s answers %q, expected %q", i.Name, say[k], got, say[k+1])
			}
		}
		if err := f.Close(); err != nil {
			t.Error(err)
		}
	}
}

func line(t *testing.T, r io.Reader) string {
	t.Helper()
	var all []byte
	for b := make([]byte, 1); len(all) == 0 || all[len(all)-1] != '\n'; all = append(all, b[0]) {
		if _, err := r.Read(b); err != nil {
			t.Fatalf("after %q: %v", all, err)
		}
	}
	return strings.TrimSpace(string(all))
}

// A client that comes after the bench was closed is turned away.
func TestServeAfterClose(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		b, err := New(Config{Board: steady(), Clock: instruments.NewClock(1)})
		if err != nil {
			t.Fatal(err)
		}
		b.Close()
		ours, theirs := net.Pipe()
		b.Instruments()[0].Serve(theirs)
		if _, err := ours.Read(make([]byte, 1)); !errors.Is(err, io.EOF) && !errors.Is(err, io.ErrClosedPipe) {
			t.Errorf("reading gave %v", err)
		}
		ours.Close()
		b.Close()
	})
}
