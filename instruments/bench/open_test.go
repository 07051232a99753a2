package bench

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// wired is a bench of small instruments behind the addresses of its file.
type wired struct {
	supply *drivertest.Supply
	meter  *drivertest.Meter
	scope  *drivertest.Scope
	pot    *drivertest.Pot
	at     map[string]*drivertest.Listener
}

func newWired() *wired {
	w := &wired{supply: drivertest.NewSupply(), meter: drivertest.NewMeter(), scope: drivertest.NewScope(), pot: drivertest.NewPot()}
	w.at = map[string]*drivertest.Listener{
		"192.0.2.10:5025": &w.supply.Listener, "192.0.2.11:5025": &w.meter.Listener,
		"192.0.2.12:5025": &w.scope.Listener, "192.0.2.13:5025": &w.pot.Listener,
	}
	return w
}

func (w *wired) options(pace float64) Options {
	return Options{Clock: instruments.NewClock(pace), Dial: func(ctx context.Context, a link.Address) (io.ReadWriteCloser, error) {
		if l, ok := w.at[a.Host]; ok {
			return l.Dial(ctx, a)
		}
		return nil, &link.Error{Op: "open", Address: a.String(), Err: link.ErrMissing}
	}}
}

const wiredText = head + `practice = true
[supply]
address = "tcp://192.0.2.10:5025"
max_voltage = "13 V"
max_current = "1 A"
over_voltage = "14 V"
between = ["supply", "common"]
[[meter]]
name = "average"
address = "tcp://192.0.2.11:5025"
reads = "average_voltage"
between = ["load_hi", "load_lo"]
[scope]
address = "tcp://192.0.2.12:5025"
earthed = false
[scope.channel.1]
between = ["timer_out", "common"]
probe = 10
[pot]
address = "tcp://192.0.2.13:5025"
codes = 257
end_to_end = "100k 20%"
wiper = "75"
max_terminal_voltage = "16 V"
max_current = "2.5 mA"
park = 256
`

// file reads a bench file from text, with changes made to it first.
func file(t *testing.T, changes ...string) *File {
	t.Helper()
	f, err := Read(written(t, strings.NewReplacer(changes...).Replace(wiredText)))
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func inBubble(t *testing.T, name string, test func(t *testing.T)) {
	t.Run(name, func(t *testing.T) { synctest.Test(t, test) })
}

func opened(t *testing.T, w *wired, f *File, pace float64) *Opened {
	t.Helper()
	b, err := Open(t.Context(), f, w.options(pace))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := b.Close(context.Background()); err != nil {
			t.Error(err)
		}
	})
	return b
}

func TestOpen(t *testing.T) {
	inBubble(t, "AllByIdentity", func(t *testing.T) {
		b := opened(t, newWired(), file(t), 1)
		var got []string
		for _, i := range b.Info {
			got = append(got, fmt.Sprintf("%s (%s): %s %s, %s", i.Name, i.Role, i.Identity.Model, i.Identity.Serial, i.Dialect))
		}
		want := []string{
			"supply (supply): practice-supply T1, standard-supply",
			"meter average (meter): practice-meter T2, standard-meter",
			"scope (scope): practice-scope T3, standard-scope",
			"pot (pot): pot-bridge T4, nightbench-pot",
		}
		if !slices.Equal(got, want) {
			t.Errorf("got %q", got)
		}
		if b.FoundOn || !b.Practice || b.Info[0].Address != "tcp://192.0.2.10:5025" || b.Info[0].From != "standard-supply" || len(b.Info[0].Hash) != 64 {
			t.Errorf("%+v", b.Info[0])
		}
		if len(b.Info[1].Memory) != 2 {
			t.Errorf("lines from memory: %v", b.Info[1].Memory)
		}
	})
	inBubble(t, "TheRolesWork", func(t *testing.T) {
		w := newWired()
		b := opened(t, w, file(t), 1)
		w.meter.Input(4.35, 0)
		ctx := t.Context()
		for name, do := range map[string]func() error{
			"supply": func() error { return b.Supply.SetVoltage(ctx, si.Volts(9)) },
			"meter": func() error {
				_, err := b.Meters[0].Configure(ctx, instruments.MeterSettings{Unit: si.Volt, Range: 10})
				return err
			},
			"scope": func() error {
				_, err := b.Scope.Configure(ctx, instruments.ScopeSettings{Points: 100, Duration: 0.01,
					Channels: []instruments.ScopeChannel{{Number: 1, Low: 0, High: 10, Probe: 10}}, Trigger: instruments.ScopeTrigger{Channel: 1, Level: 5}})
				return err
			},
			"pot": func() error { return b.Pot.SetCode(ctx, 3) },
		} {
			if err := do(); err != nil {
				t.Errorf("%s: %v", name, err)
			}
		}
		if err := b.Supply.SetVoltage(ctx, si.Volts(13.5)); !errors.Is(err, driver.ErrLimit) {
			t.Errorf("above the bench's limit: %v", err)
		}
		if err := b.Cutoff.Open(ctx); !errors.Is(err, instruments.ErrAbsent) {
			t.Errorf("a cutoff that is not there: %v", err)
		}
	})
	inBubble(t, "OutputFoundOnIsSaid", func(t *testing.T) {
		w := newWired()
		w.supply.Leave(9, true)
		b := opened(t, w, file(t), 1)
		if !b.FoundOn || !slices.Contains(b.Info[0].Notes, "its output was on already") {
			t.Errorf("%+v", b.Info[0])
		}
	})
	inBubble(t, "EveryExchangeIsHeard", func(t *testing.T) {
		w := newWired()
		heard := map[string]int{}
		var one = make(chan struct{}, 1)
		o := w.options(1)
		o.Exchange = func(name string, _ scpi.Exchange) { one <- struct{}{}; heard[name]++; <-one }
		b, err := Open(t.Context(), file(t), o)
		if err != nil {
			t.Fatal(err)
		}
		if err := b.Close(t.Context()); err != nil {
			t.Error(err)
		}
		for _, i := range b.Info {
			if heard[i.Name] == 0 {
				t.Errorf("nothing heard of %s", i.Name)
			}
		}
	})
}

func TestOpenFails(t *testing.T) {
	for name, c := range map[string]struct {
		spoil   func(w *wired)
		changes []string
		pace    float64
		kind    error
		says    []string
	}{
		"SilentPort": {func(w *wired) { w.meter.Fate = func(string) drivertest.Fate { return drivertest.Fate{Drop: true} } }, nil, 1,
			link.ErrTimeout, []string{"meter average", "192.0.2.11", "*IDN?", "baud"}},
		"PortInUse": {func(w *wired) { w.pot.Refuse = link.ErrBusy }, nil, 1,
			link.ErrBusy, []string{"pot", "192.0.2.13"}},
		"NoSuchDevice": {func(w *wired) { delete(w.at, "192.0.2.12:5025") }, nil, 1,
			link.ErrMissing, []string{"scope"}},
		"SwappedAddresses": {func(w *wired) {
			w.at["192.0.2.10:5025"], w.at["192.0.2.11:5025"] = w.at["192.0.2.11:5025"], w.at["192.0.2.10:5025"]
		}, nil, 1,
			driver.ErrWrong, []string{"practice-meter", "which is a meter", "swapped", "practice-supply"}},
		"SwappedWithDialectsNamed": {func(w *wired) { w.at["192.0.2.10:5025"] = &drivertest.NewPot().Listener },
			[]string{"[supply]\n", "[supply]\ndialect = \"standard-supply\"\n"}, 1,
			driver.ErrWrong, []string{"pot-bridge", "which is a pot"}},
		"NotTheDialectsFamily": {func(w *wired) { w.pot.Device.Identity = "Growhouse,bridge,7,1" },
			[]string{"[pot]\n", "[pot]\ndialect = \"nightbench-pot\"\n"}, 1,
			driver.ErrWrong, []string{"Growhouse bridge", "nightbench-pot is for Nightbench pot-bridge*"}},
		"NobodyKnowsIt": {func(w *wired) { w.meter.Device.Identity = "Growhouse,meter,7,1" }, nil, 1,
			dialect.ErrUnknown, []string{"Growhouse meter", "standard-meter"}},
		"PaceBeforeARealSupply": {func(w *wired) { w.supply.Device.Identity = "Growhouse,PSU-1,7,1" },
			[]string{"[supply]\n", "[supply]\ndialect = \"standard-supply\"\n"}, 20,
			ErrPace, []string{"pace 20", "Growhouse PSU-1"}},
		"PracticeBeforeARealSupply": {func(w *wired) { w.supply.Device.Identity = "Growhouse,PSU-1,7,1" },
			[]string{"[supply]\n", "[supply]\ndialect = \"standard-supply\"\n"}, 1,
			ErrPace, []string{"practice = true"}},
		"AnotherSerial": {func(*wired) {}, []string{"[[meter]]\n", "[[meter]]\nserial = \"T9\"\n"}, 1,
			driver.ErrWrong, []string{"meter average", "serial T2", `serial = "T9"`, "swapped"}},
		"AnotherPart":     {func(*wired) {}, []string{"codes = 257", "codes = 300"}, 1, driver.ErrWrong, []string{"257 codes"}},
		"AnotherChannel":  {func(*wired) {}, []string{"[supply]\n", "[supply]\nchannel = 2\n"}, 1, dialect.ErrCannot, []string{"channel = 2", "standard-supply"}},
		"GarbageIsNobody": {func(w *wired) { w.scope.Device.Identity = "\x80\xff\x81" }, nil, 1, scpi.ErrFraming, []string{"scope", "baud rate"}},
	} {
		inBubble(t, name, func(t *testing.T) {
			w := newWired()
			f := file(t, c.changes...)
			c.spoil(w)
			_, err := Open(t.Context(), f, w.options(c.pace))
			if !errors.Is(err, c.kind) {
				t.Fatalf("got %v, want a %q", err, c.kind)
			}
			for _, part := range c.says {
				if !strings.Contains(err.Error(), part) {
					t.Errorf("%q does not say %q", err, part)
				}
			}
			if w.supply.On() {
				t.Error("the output was on")
			}
		})
	}
	inBubble(t, "SeveralAtOnceAreAllTold", func(t *testing.T) {
		w := newWired()
		f := file(t)
		w.pot.Refuse, w.scope.Refuse = link.ErrBusy, link.ErrDenied
		began := time.Now()
		_, err := Open(t.Context(), f, w.options(1))
		if !errors.Is(err, link.ErrBusy) || !errors.Is(err, link.ErrDenied) {
			t.Errorf("got %v", err)
		}
		if took := time.Since(began); took > 2*time.Second {
			t.Errorf("took %v", took)
		}
	})
}

func TestLineFrequency(t *testing.T) {
	inBubble(t, "TenPeriodsOf60Hz", func(t *testing.T) {
		b := opened(t, newWired(), file(t, "practice = true\n", "practice = true\nline_frequency = \"60 Hz\"\n"), 1)
		got, err := b.Meters[0].Configure(t.Context(), instruments.MeterSettings{Unit: si.Volt, Range: 10, Aperture: 0.2})
		if err != nil || math.Abs(got.Aperture-10.0/60) > 1e-9 {
			t.Errorf("aperture %g s, %v", got.Aperture, err)
		}
	})
	if _, err := Read(written(t, strings.Replace(wiredText, "practice = true", `line_frequency = "55 Hz"`, 1))); err == nil || !strings.Contains(err.Error(), "bench.line_frequency") {
		t.Errorf("55 Hz: %v", err)
	}
}

func TestUnknownDialectIsAMistakeInTheFile(t *testing.T) {
	path := written(t, strings.Replace(wiredText, "[scope]\n", "[scope]\ndialect = \"standard-skope\"\n", 1))
	_, err := Read(path)
	if err == nil {
		t.Fatal("it was read")
	}
	for _, part := range []string{path, "scope.dialect", "standard-skope", "standard-scope"} {
		if !strings.Contains(err.Error(), part) {
			t.Errorf("%q does not say %q", err, part)
		}
	}
}

func TestPracticeSupplyMarksTheBench(t *testing.T) {
	inBubble(t, "Practice", func(t *testing.T) {
		b := opened(t, newWired(), file(t, "practice = true\n", ""), 1)
		if !b.Practice || len(b.Info[0].Notes) != 1 {
			t.Errorf("practice %v, notes %v", b.Practice, b.Info[0].Notes)
		}
	})
}

func TestCloseTellsAndIsRepeatable(t *testing.T) {
	inBubble(t, "Twice", func(t *testing.T) {
		w := newWired()
		b, err := Open(t.Context(), file(t), w.options(1))
		if err != nil {
			t.Fatal(err)
		}
		for range 2 {
			if err := b.Close(t.Context()); err != nil {
				t.Error(err)
			}
		}
		if _, err := b.Supply.State(t.Context()); !errors.Is(err, link.ErrClosed) {
			t.Errorf("a closed bench answers %v", err)
		}
		if w.supply.Count("OUTP OFF") > 0 {
			t.Error("closing switched the output: making safe comes before")
		}
	})
}

func TestWithLine(t *testing.T) {
	for _, c := range []struct{ address, line, want string }{
		{"serial:///dev/ttyS7", "baud=115200", "115200 8 none 1"},
		{"serial:///dev/ttyS7?baud=9600", "baud=115200&stop=2", "9600 8 none 2"},
		{"serial:///dev/ttyS7", "", "9600 8 none 1"},
		{"tcp://192.0.2.10:5025", "baud=115200", "0 0  "},
	} {
		a, err := link.Parse(c.address)
		if err != nil {
			t.Fatal(err)
		}
		got, err := withLine(a, c.line)
		if err != nil {
			t.Fatal(err)
		}
		if l := fmt.Sprint(got.Line.Baud, got.Line.Bits, " ", got.Line.Parity, " ", got.Line.Stop); l != c.want {
			t.Errorf("%s with %s: %q, want %q", c.address, c.line, l, c.want)
		}
	}
}
