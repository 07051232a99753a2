package driver

import (
	"math"
	"testing"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/si"
)

var meters = []struct {
	dialect              string
	make                 func() *drivertest.MakerMeter
	want                 float64 // V, range wanted
	range_               float64 // V, in force
	limit                float64 // V, at 5 V there
	aperture, inForce    float64 // s
	amperesWant, amperes float64 // A, range wanted and in force
}{
	// 5 V on 10 V: 0.0035 % of reading + 0.0005 % of range (34401A)
	{"hp-34401a", func() *drivertest.MakerMeter { return drivertest.HP34401A(false) }, 9, 10, 175e-6 + 50e-6, 0.2, 0.2, 0.5, 1},
	{"keysight-3446x", func() *drivertest.MakerMeter { return drivertest.HP34401A(true) }, 9, 10, 175e-6 + 50e-6, 0.2, 0.2, 0.5, 1},
	// Keithley: 10 V range, 5 V, 30 ppm + 5 ppm is 150 µV + 50 µV (2016 specification), and 0.15 ppm of noise
	{"keithley-2000", drivertest.K2000, 9, 10, 200e-6, 0.2, 0.2, 0.5, 1},
	{"keithley-2110", drivertest.K2110, 9, 10, 600e-6 + 200e-6, 0.2, 0.2, 0.5, 1},
	{"rigol-dm3058", drivertest.DM3058, 12, 20, 0.00015*5 + 0.00004*20, 0.3, 0.4, 0.15, 0.2},
	{"siglent-sdm3055", drivertest.SDM3055, 12, 20, 0.00015*5 + 0.00004*20, 0.2, 0.2, 0.15, 0.2},
	// 12 V is nearer to 10 V, to which it would round
	{"gwinstek-gdm8261a", drivertest.GDM8261A, 12, 100, 0.000045*5 + 0.000006*100, 0.2, 0.2, 0.5, 1},
}

func openMakerMeter(t *testing.T, f *drivertest.MakerMeter, name string) *Meter {
	t.Helper()
	conn, d := asTheDialectSays(t, &f.Maker, dialect.RoleMeter, name)
	m, notes, err := OpenMeter(t.Context(), conn, d, MeterOptions{Options: options("meter")})
	must(t, err)
	if len(notes) != 0 {
		t.Errorf("noticed %v", notes)
	}
	return m
}

func TestMakersMeters(t *testing.T) {
	for _, c := range meters {
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			f.Volts, f.Amperes = 5, -0.0125
			m := openMakerMeter(t, f, c.dialect)
			id, err := m.Identify(t.Context())
			must(t, err)
			if !m.d.Matches(id) {
				t.Errorf("%s is not of its own dialect", id)
			}
			got, err := m.Configure(t.Context(), instruments.MeterSettings{Unit: si.Volt, Range: c.want, Aperture: c.aperture})
			must(t, err)
			if got.Range != c.range_ || math.Abs(got.Aperture-c.inForce) > 1e-9 {
				t.Errorf("in force %+v, want %g V and %g s", got, c.range_, c.inForce)
			}
			s, err := m.Read(t.Context())
			must(t, err)
			if s.Value != 5 || s.Outcome != instruments.Measured || s.Unit != si.Volt {
				t.Errorf("reading %+v", s)
			}
			if limit := s.Accuracy.Limit(5, s.Range); math.Abs(limit-c.limit) > 0.02*c.limit {
				t.Errorf("limit of error %g V, want %g V", limit, c.limit)
			}
			got, err = m.Configure(t.Context(), instruments.MeterSettings{Unit: si.Ampere, Range: c.amperesWant})
			must(t, err)
			if got.Range != c.amperes || !f.Current {
				t.Errorf("in force %+v, want %g A", got, c.amperes)
			}
			if s, err = m.Read(t.Context()); err != nil || s.Value != -0.0125 || s.Unit != si.Ampere {
				t.Errorf("reading %+v, %v", s, err)
			}
			must(t, m.Close(t.Context()))
		})
	}
}

func TestMakersOverload(t *testing.T) {
	for _, c := range meters {
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			f.Volts = -2000
			m := openMakerMeter(t, f, c.dialect)
			must(t, second(m.Configure(t.Context(), instruments.MeterSettings{Unit: si.Volt, Range: c.want})))
			s, err := m.Read(t.Context())
			must(t, err)
			if s.Outcome != instruments.Overload || !math.IsNaN(s.Value) {
				t.Errorf("−2 kV on %g V: %+v", c.range_, s)
			}
		})
	}
}

func TestMakersSpeeds(t *testing.T) {
	for _, c := range meters {
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			m := openMakerMeter(t, f, c.dialect)
			for _, speed := range m.d.Speeds {
				got, err := m.Configure(t.Context(), instruments.MeterSettings{Unit: si.Volt, Range: c.want, Aperture: m.seconds(speed.Setting)})
				must(t, err)
				if math.Abs(got.Aperture-m.seconds(speed.Setting)) > 1e-9 {
					t.Errorf("asked %g s, got %g s", m.seconds(speed.Setting), got.Aperture)
				}
				must(t, second(m.Read(t.Context())))
			}
		})
	}
}

func TestRangeAboveTheHighest(t *testing.T) {
	inBubble(t, "IsRefused", func(t *testing.T) {
		m := openMakerMeter(t, drivertest.DM3058(), "rigol-dm3058")
		_, err := m.Configure(t.Context(), instruments.MeterSettings{Unit: si.Volt, Range: 1500})
		wants(t, err, ErrRefused, "1500", "1000")
	})
}
