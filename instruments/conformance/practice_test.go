package conformance

import (
	"context"
	"errors"
	"net"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"nightbench/instruments"
	"nightbench/instruments/practice"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// line is a person at one end of a pipe.
type line struct{ net.Conn }

func (l line) Send(_ context.Context, message string) error {
	_, err := l.Write([]byte(message + "\n"))
	return err
}

func (l line) Ask(ctx context.Context, message string) (string, error) {
	if err := l.Send(ctx, message); err != nil {
		return "", err
	}
	l.SetReadDeadline(time.Now().Add(20 * time.Second))
	var all []byte
	buf := make([]byte, 4096)
	for {
		n, err := l.Read(buf)
		all = append(all, buf[:n]...)
		if text, done := strings.CutSuffix(string(all), "\n"); done {
			return text, nil
		}
		if err != nil {
			return "", errors.Join(errors.New("no reply"), err)
		}
	}
}

func everything() practice.Config {
	return practice.Config{
		Board: circuit.Board{
			Source: circuit.Source{Resistance: 0.05, Bulk: 100e-6, Bleed: 470},
			Timing: circuit.Timing{Network: circuit.Clocked, Period: 1e-3, Duty: 0.25},
			Timer:  circuit.Timer{Threshold: 2. / 3, Trigger: 0.5, MinSupply: 2},
			Driver: circuit.Driver{Stage: circuit.NMOS, Resistance: 0.05},
			Load:   circuit.Load{Kind: circuit.Resistor, Resistance: 100},
		},
		Seed: 7, Cutoff: true, Probe: true,
		Pot:      practice.Pot{Codes: 257, Track: 100e3, Wiper: 75, Start: 128},
		Channels: []practice.Channel{{Number: 1, Probe: circuit.Between(circuit.TimerOut, circuit.Common)}},
		Meters:   []practice.Meter{{Name: "average", Probe: circuit.Between(circuit.LoadHi, circuit.LoadLo), Unit: si.Volt}},
	}
}

// Every exchange with every practice instrument.
func TestPracticeInstrumentsConform(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := everything()
		c.Clock = instruments.NewClock(1)
		b, err := practice.New(c)
		if err != nil {
			t.Fatal(err)
		}
		defer b.Close()
		count := 0
		for _, i := range b.Instruments() {
			ours, theirs := net.Pipe()
			defer ours.Close()
			i.Serve(theirs)
			for _, e := range append(append([]Exchange{}, Common...), Of[i.Role]...) {
				count++
				if err := Check(t.Context(), line{ours}, e); err != nil {
					t.Errorf("%s: %v", i.Name, err)
				}
			}
		}
		t.Logf("%d common exchanges, %d in all with %d instruments", len(Common), count, len(b.Instruments()))
	})
	if len(Common) < 120 {
		t.Errorf("%d common exchanges; 120 are promised", len(Common))
	}
}

// A table that can't fail proves nothing: wrong replies, stray replies and wrong codes are found.
func TestCheckFinds(t *testing.T) {
	for _, c := range []struct {
		e       Exchange
		replies []string // in turn, to each question
		found   string
	}{
		{Exchange{Rule: "r", Say: "*OPC?", Want: "1"}, []string{"0", `0,"No error"`}, `answers "0"`},
		{Exchange{Rule: "r", Say: "*OPC?", Want: "1"}, []string{"1", `-113,"Undefined header"`}, "the error queue holds -113"},
		{Exchange{Rule: "r", Say: "NOTHING", Code: "-113"}, []string{`0,"No error"`}, "expected -113"},
		{Exchange{Rule: "r", Say: "~NOTHING?", Code: "-113"}, []string{"stray"}, "holds stray"},
		{Exchange{Rule: "r", Say: "*OPC?"}, nil, "expects no reply"},
		{Exchange{Rule: "r", Say: "*OPC?", Want: "1"}, nil, "no more"},
	} {
		err := Check(t.Context(), &parrot{c.replies}, c.e)
		if err == nil || !strings.Contains(err.Error(), c.found) {
			t.Errorf("%+v with %q: %v, expected %q", c.e, c.replies, err, c.found)
		}
	}
}

// parrot gives replies in turn.
type parrot struct{ replies []string }

func (p *parrot) Send(context.Context, string) error { return nil }

func (p *parrot) Ask(context.Context, string) (string, error) {
	if len(p.replies) == 0 {
		return "", errors.New("no more")
	}
	r := p.replies[0]
	p.replies = p.replies[1:]
	return r, nil
}

// What may never be sent to a real bench.
func TestHarmless(t *testing.T) {
	for _, say := range []string{"OUTP ON", "outp 1", "VOLT 1;OUTPut:STATe ON;OUTP?", "OUTP\ton", "*TST?", "*tst?", "VOLT:PROT:CLE", "OUTPut:PROTection:CLEar", "FEED", "FEED;CLOS?", "*RCL 1"} {
		if (Exchange{Say: say}).Harmless() {
			t.Errorf("%q would be sent to a real instrument", say)
		}
	}
	for _, say := range []string{"OUTP OFF", "OUTP 0", "OUTP?", "VOLT 3;VOLT?", "*RST", "VOLT:PROT:TRIP?", "*OPC?"} {
		if !(Exchange{Say: say}).Harmless() {
			t.Errorf("%q is held to be dangerous", say)
		}
	}
}
