package driver

import (
	"math"
	"strings"
	"testing"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
)

var scopes = []struct {
	dialect  string
	make     func() *drivertest.MakerScope
	probe    float64
	points   int
	high     float64 // divisions
	duty     bool
	nothing  instruments.Outcome
	middleAt float64 // V, of the screen asked for: −1 to 10 V
}{
	{"keysight-infiniivision", drivertest.InfiniiVision, 10, 1000, 8, true, instruments.NoMeasurement, 4.5},
	{"rigol-ds1000z", drivertest.DS1054Z, 10, 1200, 8, true, instruments.NoMeasurement, 4.5},
	{"tektronix-tds2000", drivertest.TDS2024B, 10, 2500, 8, false, instruments.NoMeasurement, 4.5},
	{"siglent-sds1000xe", drivertest.SDS1104XE, 10, 7000, 8, true, instruments.NoMeasurement, 4.5},
	{"rs-rtb2000", func() *drivertest.MakerScope { return drivertest.RTB2004(false) }, 1, 10000, 8, true, instruments.NotANumber, 4.5},
}

// wave is a sine of 4 V about 4.5 V on channel 1, and 30 V, beyond its screen, on channel 2.
func wave(channel int, t float64) float64 {
	if channel == 2 {
		return 30
	}
	return 4.5 + 4*math.Sin(2*math.Pi*125*t)
}

func openMakerScope(t *testing.T, f *drivertest.MakerScope, name string) *Scope {
	t.Helper()
	f.Signal = wave
	conn, d := asTheDialectSays(t, &f.Maker, dialect.RoleScope, name)
	s, notes, err := OpenScope(t.Context(), conn, d, options("scope"))
	must(t, err)
	if len(notes) != 0 {
		t.Errorf("noticed %v", notes)
	}
	return s
}

func screens(probe float64) instruments.ScopeSettings {
	return instruments.ScopeSettings{Points: 800, Duration: 0.02, Trigger: instruments.ScopeTrigger{Channel: 1, Level: 4.5},
		Channels: []instruments.ScopeChannel{{Number: 1, Low: -1, High: 10, Probe: probe}, {Number: 2, Low: -1, High: 10, Probe: probe}}}
}

// Volts and instants of every family are those of the signal at the tip,
// whatever its screen, codes and preamble are.
func TestMakersScopes(t *testing.T) {
	for _, c := range scopes {
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			s := openMakerScope(t, f, c.dialect)
			got, err := s.Configure(t.Context(), screens(c.probe))
			must(t, err)
			first := got.Channels[0]
			if got.Points != c.points || got.Duration < 0.02 || math.Abs((first.High+first.Low)/2-c.middleAt) > 0.05 || math.Abs(first.High-first.Low-2*c.high) > 1e-9 {
				t.Errorf("in force %+v", got)
			}
			waves, err := s.Capture(t.Context())
			must(t, err)
			follows(t, waves[0], f)
			for i, k := range waves[1].Codes {
				if k < waves[1].ClipHigh {
					t.Fatalf("sample %d of channel 2 is %d; 30 V on a screen up to 10 V is clipped from %d", i, k, waves[1].ClipHigh)
				}
			}
			must(t, s.Close(t.Context()))
		})
	}
}

// follows holds a record against the signal, sample by sample.
func follows(t *testing.T, w instruments.Waveform, f *drivertest.MakerScope) {
	t.Helper()
	if !w.Triggered || w.FullScale < 11 || !(w.Accuracy.Limit(5, w.FullScale) > 0) || !(w.TimeBase > 0) {
		t.Errorf("triggered %v, %g V high, limit %g V, time base %g", w.Triggered, w.FullScale, w.Accuracy.Limit(5, w.FullScale), w.TimeBase)
	}
	if middle := w.Start + w.Interval*float64(len(w.Codes))/2; math.Abs(middle) > w.Interval {
		t.Errorf("the trigger, in the middle of the screen, is at %g s", middle)
	}
	for i, k := range w.Codes {
		v := float64(k)*w.VoltsPerCode + w.VoltsAtZero
		want := wave(w.Channel, w.Start+float64(i)*w.Interval)
		if math.Abs(v-want) > 0.51*w.Accuracy.Resolution+1e-6 || k <= w.ClipLow || k >= w.ClipHigh {
			t.Fatalf("sample %d: code %d is %g V, the signal %g V (a code is %g V)", i, k, v, want, w.VoltsPerCode)
		}
	}
}

func TestMakersScopesWithoutATrigger(t *testing.T) {
	for _, c := range scopes {
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			f.Dead = true
			s := openMakerScope(t, f, c.dialect)
			must(t, second(s.Configure(t.Context(), screens(c.probe))))
			for range 2 { // the trigger is waited for again the next time
				waves, err := s.Capture(t.Context())
				must(t, err)
				if len(waves) != 2 || waves[0].Triggered || len(waves[0].Codes) != c.points {
					t.Fatalf("%d waves", len(waves))
				}
			}
		})
	}
}

// A duty cycle is a ratio here, whether the scope answers 30 or 0.3; what can't
// be measured has no value.
func TestMakersMeasurements(t *testing.T) {
	for _, c := range scopes {
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			s := openMakerScope(t, f, c.dialect)
			for what, want := range map[string]float64{"duty": 0.3, "frequency": 125, "period": 8e-3, "mean": 4.5} {
				got, err := s.Measure(t.Context(), what, 1)
				if what == "duty" && !c.duty {
					wants(t, err, dialect.ErrCannot, "duty cycle")
					continue
				}
				must(t, err)
				if got.Outcome != instruments.Measured || math.Abs(got.Value-want) > 1e-9 {
					t.Errorf("%s is %+v, want %g", what, got, want)
				}
			}
			f.Do(func() { f.Duty = math.NaN() })
			got, err := s.Measure(t.Context(), "frequency", 1)
			must(t, err)
			if got.Outcome != c.nothing || !math.IsNaN(got.Value) {
				t.Errorf("nothing to measure: %+v", got)
			}
		})
	}
}

// A list of events has to be released before it is read, and its codes are those of the standard.
func TestEventsOfAScopeWithoutAQueue(t *testing.T) {
	inBubble(t, "Read", func(t *testing.T) {
		s := openMakerScope(t, drivertest.TDS2024B(), "tektronix-tds2000")
		must(t, s.conn.Write(t.Context(), "FOO 1"))
		wants(t, s.clean(t.Context(), "set-up"), ErrComplained, "-113", "Undefined header")
		must(t, s.clean(t.Context(), "set-up"))
	})
}

// own is a dialect of ours with some of its text changed, as a user's own file would have it.
func own(t *testing.T, role dialect.Role, name string, changes ...string) *dialect.Dialect {
	t.Helper()
	d, err := dialect.Find(role, name)
	must(t, err)
	for i := 0; i < len(changes); i += 2 {
		if !strings.Contains(d.Text, changes[i]) {
			t.Fatalf("%s no longer holds %q", name, changes[i])
		}
	}
	d, err = dialect.Parse("own.toml", []byte(strings.NewReplacer(changes...).Replace(d.Text)))
	must(t, err)
	return d
}

func TestRecordAsText(t *testing.T) {
	inBubble(t, "VoltsWithoutAHead", func(t *testing.T) {
		f := drivertest.RTB2004(true)
		f.Signal = wave
		d := own(t, dialect.RoleScope, "rs-rtb2000", `family = "code-linear"`, `family = "volts"`, `samples = "uint8"`, "samples = \"text\"\nhead = \"none\"\nlevels = 256",
			"clip_low = 0\nclip_high = 255\n", "", `yincrement = {`, `# {`, `yorigin = {`, `# {`, "UINT,8", "ASC")
		s, _, err := OpenScope(t.Context(), over(t, &f.Maker, d), d, options("scope"))
		must(t, err)
		must(t, second(s.Configure(t.Context(), screens(1))))
		waves, err := s.Capture(t.Context())
		must(t, err)
		follows(t, waves[0], f)
	})
}

func TestRecordInParts(t *testing.T) {
	inBubble(t, "IsPutTogether", func(t *testing.T) {
		f := drivertest.DS1054Z()
		f.Signal = wave
		d := own(t, dialect.RoleScope, "rigol-ds1000z", "most_a_read = 250_000", "most_a_read = 500")
		s, _, err := OpenScope(t.Context(), over(t, &f.Maker, d), d, options("scope"))
		must(t, err)
		must(t, second(s.Configure(t.Context(), screens(10))))
		for range 2 { // from the start again
			waves, err := s.Capture(t.Context())
			must(t, err)
			follows(t, waves[0], f)
		}
		if got := strings.Join(f.Received(), "\n"); strings.Count(got, ":WAV:DATA?") != 12 { // 3 parts of 2 channels, twice
			t.Errorf("read %d parts", strings.Count(got, ":WAV:DATA?"))
		}
	})
}

// A probe's factor that a dialect can't tell its scope is refused, not ignored.
func TestProbeThatCannotBeTold(t *testing.T) {
	inBubble(t, "IsRefused", func(t *testing.T) {
		s := openMakerScope(t, drivertest.RTB2004(false), "rs-rtb2000")
		_, err := s.Configure(t.Context(), screens(10))
		wants(t, err, dialect.ErrCannot, "be told a probe's factor")
	})
}
