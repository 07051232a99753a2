package driver

import (
	"fmt"
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

// Known codes become the volts and instants that the makers' guides work out.
func TestKnownCodes(t *testing.T) {
	for _, c := range []struct {
		name, dialect string
		make          func() *drivertest.MakerScope
		instead       map[string]string
		code          byte
		volts         float64
		i             int
		at            float64
	}{
		// 2000X programmer's guide p. 644: (178 - 128)·0.02 + 0.5 = 1.5 V; 250·1 µs - 500 µs
		{"VoltsOrigin", "keysight-infiniivision", drivertest.InfiniiVision,
			map[string]string{":WAV:PRE?": "+0,+0,+1000,+1,+1.00000000E-06,-5.00000000E-04,+0,+2.00000000E-02,+5.00000000E-01,+128"}, 178, 1.5, 250, -250e-6},
		// DS1000Z guide 2-140: (142 - 50 - 127)·0.008 = -0.28 V
		{"CountsOrigin", "rigol-ds1000z", drivertest.DS1054Z,
			map[string]string{":WAV:PRE?": "0,0,1200,1,1.000000e-06,-6.000000e-04,0,0.008000,50,127"}, 142, -0.28, 600, 0},
		// SDS1104X-E guide p. 142: 0xFC is -4, and -4·(0.5/25) - (-0.05) = -0.03 V; first point -5 µs·14/2
		{"PerDivision", "siglent-sds1000xe", drivertest.SDS1104XE,
			map[string]string{"C1:VDIV?": "5.00E-01V", "C1:OFST?": "-5.00E-02V", "TDIV?": "5.00E-06S", "SARA?": "1.00E+08Sa/s"}, 0xfc, -0.03, 0, -35e-6},
		// TDS manual 2-178: (25 - (-50))·0.04 + 1 = 4 V; (0 - 1250)·4 µs
		{"Multiplier", "tektronix-tds2000", drivertest.TDS2024B,
			map[string]string{"WFMPRE:YMULT?": "4.0E-2", "WFMPRE:YOFF?": "-5.0E1", "WFMPRE:YZERO?": "1.0E0", "WFMPRE:XINCR?": "4.0E-6"}, 25, 4, 0, -5e-3},
		// RTB2000 manual p. 342: raw 255 is the top of the screen: -4 + 8/255·255 = 4 V
		{"Linear", "rs-rtb2000", func() *drivertest.MakerScope { return drivertest.RTB2004(false) },
			map[string]string{"CHAN1:DATA:YINC?": "3.137254902E-02", "CHAN1:DATA:YOR?": "-4.0E+00", "CHAN1:DATA:XINC?": "1.0E-06", "CHAN1:DATA:XOR?": "-6.0E-03"}, 255, 4, 6000, 0},
	} {
		inBubble(t, c.name, func(t *testing.T) {
			f := c.make()
			s := openMakerScope(t, f, c.dialect)
			want := screens(1)
			want.Channels = want.Channels[:1]
			got, err := s.Configure(t.Context(), want)
			must(t, err)
			data := strings.Repeat(string([]byte{c.code}), got.Points)
			ask := s.put(0).Fill(s.d.Commands["record"].Ask)
			c.instead[ask] = map[bool]string{true: "DAT2,"}[c.dialect == "siglent-sds1000xe"] + fmt.Sprintf("#9%09d", len(data)) + data
			if c.dialect == "siglent-sds1000xe" {
				c.instead[ask] += "\n"
			}
			must(t, s.acquireNow(t))
			f.Do(func() { f.Instead = c.instead })
			w, err := s.fetch(t.Context(), got.Channels[0])
			must(t, err)
			if v := float64(w.Codes[c.i])*w.VoltsPerCode + w.VoltsAtZero; math.Abs(v-c.volts) > 1e-9 {
				t.Errorf("code %d is %g V, want %g V", c.code, v, c.volts)
			}
			if at := w.Start + float64(c.i)*w.Interval; math.Abs(at-c.at) > 1e-12 {
				t.Errorf("sample %d is at %g s, want %g s", c.i, at, c.at)
			}
		})
	}
}

// acquireNow takes a record and leaves it in the scope.
func (s *Scope) acquireNow(t *testing.T) error {
	_, err := s.acquire(t.Context())
	return err
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
			"clip_low = 0\nclip_high = 255\n", "", `unchecked = ["clip_low", "clip_high", "most_points", "time_base"]`, "", `yincrement = {`, `# {`, `yorigin = {`, `# {`, "UINT,8", "ASC")
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
