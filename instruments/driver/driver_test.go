package driver

import (
	"errors"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// connect opens a link to a listener and makes the connection a dialect asks for.
func connect(t *testing.T, l *drivertest.Listener, role dialect.Role, name string) (*scpi.Conn, *dialect.Dialect) {
	t.Helper()
	d, err := dialect.Find(role, name)
	if err != nil {
		t.Fatal(err)
	}
	addr, err := link.Parse("tcp://192.0.2.10:5025")
	if err != nil {
		t.Fatal(err)
	}
	k, err := link.Open(t.Context(), addr, link.Options{Dial: l.Dial})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := k.Close(); err != nil {
			t.Error(err)
		}
	})
	return scpi.New(k, Settings(d)), d
}

func options(name string) Options {
	return Options{Name: name, Clock: instruments.NewClock(1)}
}

// inBubble runs a test on a clock that jumps over waiting.
func inBubble(t *testing.T, name string, test func(t *testing.T)) {
	t.Run(name, func(t *testing.T) { synctest.Test(t, test) })
}

// wants fails unless err is of a kind and its words hold all the parts.
func wants(t *testing.T, err, kind error, parts ...string) {
	t.Helper()
	if !errors.Is(err, kind) {
		t.Fatalf("got %v, want a %q", err, kind)
	}
	for _, p := range parts {
		if !strings.Contains(err.Error(), p) {
			t.Errorf("%q does not say %q", err, p)
		}
	}
}

func must(t *testing.T, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

func TestErrorSaysWhoWhatAndWhatToTry(t *testing.T) {
	err := &Error{Instrument: "meter average", Command: "READ?", Found: "garbage", Try: "look at the cable", Err: ErrReply}
	for _, part := range []string{"meter average", "READ?", "garbage", "look at the cable", ErrReply.Error()} {
		if !strings.Contains(err.Error(), part) {
			t.Errorf("%q does not say %q", err, part)
		}
	}
	if !errors.Is(err, ErrReply) {
		t.Error("the cause is hidden")
	}
}

func TestParseFlag(t *testing.T) {
	bit := func(n int, base string) dialect.Line {
		return dialect.Line{Reply: dialect.ReplyBit, Bits: []int{n}, Base: base, YesIs: 1}
	}
	words := dialect.Line{Reply: dialect.ReplyBool, Yes: []string{"ON", "YES"}, No: []string{"OFF"}}
	for _, c := range []struct {
		line  dialect.Line
		reply string
		want  bool
		fails bool
	}{
		{bit(0, "decimal"), "1", true, false},
		{bit(0, "decimal"), "+2", false, false},
		{bit(1, "decimal"), "2", true, false},
		{bit(5, "hex"), "0x0224", true, false}, // PSD7303 manual p. 39: SYST:STAT? as hexadecimal text; 0x24 has bit 5 set
		{bit(4, "hex"), "0x0224", false, false},
		{bit(0, "decimal"), "ON", false, true},
		{words, "yes", true, false},
		{words, "OFF", false, false},
		{words, "1", false, true},
	} {
		got, err := parseFlag(c.line, c.reply, 1)
		if got != c.want || (err != nil) != c.fails {
			t.Errorf("%v of %q: got %v, %v", c.line, c.reply, got, err)
		}
	}
}

func TestParseNumberInTheFormOfItsLine(t *testing.T) {
	for _, c := range []struct {
		name  string
		line  dialect.Line
		reply string
		want  float64
		is    scpi.Outcome
	}{
		{"Plain", dialect.Line{Scale: 1}, "+1.25E-03", 1.25e-3, scpi.Measured},
		{"Percent", dialect.Line{Scale: 0.01}, "50", 0.5, scpi.Measured},
		{"Unit", dialect.Line{Scale: 1, Unit: "V"}, "5.00V", 5, scpi.Measured},
		{"OverloadWord", dialect.Line{Scale: 1, Overload: []string{"OL"}}, "OL", 0, scpi.Overload},
		{"Infinity", dialect.Line{Scale: 1, Infinity: "overload"}, "9.90000000E+37", 0, scpi.Overload},
		{"InfinityOfAScope", dialect.Line{Scale: 1, Infinity: "no measurement"}, "9.9E37", 0, scpi.NoMeasurement},
		{"NotANumber", dialect.Line{Scale: 1}, "9.91E37", 0, scpi.NotANumber},
		{"NoValueWord", dialect.Line{Scale: 1, NoValue: []string{"****"}}, "****", 0, scpi.NoMeasurement},
	} {
		t.Run(c.name, func(t *testing.T) {
			n, err := parseNumber(c.line, c.reply)
			if err != nil || n.Outcome != c.is || c.is == scpi.Measured && n.Value != c.want {
				t.Errorf("got %v (%v), %v", n.Value, n.Outcome, err)
			}
		})
	}
}

// pause lets s seconds pass.
func pause(t *testing.T, s float64) {
	t.Helper()
	must(t, instruments.NewClock(1).Sleep(t.Context(), time.Duration(s*float64(time.Second))))
}
