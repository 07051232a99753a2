package driver

import (
	"errors"
	"math"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

func openMeter(t *testing.T, f *drivertest.Meter, o MeterOptions) *Meter {
	t.Helper()
	conn, d := connect(t, &f.Listener, dialect.RoleMeter, "standard-meter")
	if o.Clock == nil {
		o.Options = options("meter average")
	}
	m, _, err := OpenMeter(t.Context(), conn, d, o)
	must(t, err)
	return m
}

func volts(full, aperture float64) instruments.MeterSettings {
	return instruments.MeterSettings{Unit: si.Volt, Range: full, Aperture: aperture}
}

func TestMeterConfigure(t *testing.T) {
	for _, c := range []struct {
		name string
		want instruments.MeterSettings
		got  instruments.MeterSettings
	}{
		{"NextRangeUp", volts(10.8, 0.2), volts(100, 0.2)},
		{"RangeItself", volts(10, 0.2), volts(10, 0.2)},
		{"NearestAperture", volts(10, 0.03), volts(10, 0.02)},
		{"LongAperture", volts(10, 1.5), volts(10, 2)},
		{"DefaultAperture", volts(10, 0), volts(10, 0.2)},
		{"Current", instruments.MeterSettings{Unit: si.Ampere, Range: 0.8, Aperture: 0.02}, instruments.MeterSettings{Unit: si.Ampere, Range: 1, Aperture: 0.02}},
	} {
		inBubble(t, c.name, func(t *testing.T) {
			m := openMeter(t, drivertest.NewMeter(), MeterOptions{})
			got, err := m.Configure(t.Context(), c.want)
			must(t, err)
			if got != c.got {
				t.Errorf("got %+v, want %+v", got, c.got)
			}
		})
	}
	inBubble(t, "LineOf60Hz", func(t *testing.T) {
		m := openMeter(t, drivertest.NewMeter(), MeterOptions{LineFrequency: 60})
		got, err := m.Configure(t.Context(), volts(10, 0.2))
		must(t, err)
		if math.Abs(got.Aperture-10.0/60) > 1e-9 {
			t.Errorf("10 periods of 60 Hz are %g s", got.Aperture)
		}
	})
}

func TestMeterConfigureRefuses(t *testing.T) {
	inBubble(t, "AutoRange", func(t *testing.T) {
		m := openMeter(t, drivertest.NewMeter(), MeterOptions{})
		if _, err := m.Configure(t.Context(), volts(0, 0.2)); err == nil {
			t.Error("a range of 0 was taken")
		}
	})
	inBubble(t, "AnUnknownUnit", func(t *testing.T) {
		m := openMeter(t, drivertest.NewMeter(), MeterOptions{})
		if _, err := m.Configure(t.Context(), instruments.MeterSettings{Unit: si.Hertz, Range: 1}); err == nil {
			t.Error("Hz was taken")
		}
	})
	inBubble(t, "ARangeItDoesNotHave", func(t *testing.T) {
		m := openMeter(t, drivertest.NewMeter(), MeterOptions{})
		must(t, second(m.Configure(t.Context(), volts(1, 0.2))))
		_, err := m.Configure(t.Context(), volts(2000, 0.2))
		wants(t, err, ErrRefused, "meter average", "VOLT:DC:RANG 2000", "-222")
		_, err = m.Read(t.Context())
		wants(t, err, ErrNotConfigured)
	})
	inBubble(t, "ANodeItDoesNotKnow", func(t *testing.T) {
		f := drivertest.NewMeter()
		m := openMeter(t, f, MeterOptions{})
		f.Fate = func(msg string) drivertest.Fate {
			if msg == "VOLT:DC:NPLC?" {
				f.Device.Push(scpi.NewFault(scpi.UndefinedHeader, "VOLT:DC:NPLC?"))
				return drivertest.Fate{Drop: true}
			}
			return drivertest.Fate{}
		}
		_, err := m.Configure(t.Context(), volts(10, 0.2))
		wants(t, err, link.ErrTimeout, "VOLT:DC:NPLC?", "-113")
	})
}

func second[T any](_ T, err error) error { return err }

func TestMeterRead(t *testing.T) {
	inBubble(t, "CarriesRangeApertureAndAccuracy", func(t *testing.T) {
		f := drivertest.NewMeter()
		f.Input(4.35, 0)
		m := openMeter(t, f, MeterOptions{})
		must(t, second(m.Configure(t.Context(), volts(10, 0.2))))
		s, err := m.Read(t.Context())
		must(t, err)
		if s.Value != 4.35 || s.Outcome != instruments.Measured || s.Range != 10 || s.Aperture != 0.2 || s.Unit != si.Volt || s.Raw == "" {
			t.Errorf("%+v", s)
		}
		// HP 34401A, one year, 10 V range: 0.0035 % of reading + 0.0005 % of range.
		if got, want := s.Accuracy.Limit(4.35, 10), 35e-6*4.35+5e-6*10; math.Abs(got-want) > 1e-12 {
			t.Errorf("limit of error %g V, want %g V", got, want)
		}
		if math.Abs(s.Accuracy.Resolution-1e-5) > 1e-12 {
			t.Errorf("resolution %g V", s.Accuracy.Resolution)
		}
	})
	inBubble(t, "HasteAddsToTheError", func(t *testing.T) {
		m := openMeter(t, drivertest.NewMeter(), MeterOptions{})
		must(t, second(m.Configure(t.Context(), volts(10, 0.0004))))
		s, err := m.Read(t.Context())
		must(t, err)
		if math.Abs(s.Accuracy.Range-105e-6) > 1e-12 || math.Abs(s.Accuracy.Resolution-1e-3) > 1e-12 {
			t.Errorf("%+v", s.Accuracy)
		}
	})
	inBubble(t, "TheBenchFilesFigureWins", func(t *testing.T) {
		own := &instruments.Accuracy{Reading: 120e-6, Range: 40e-6}
		m := openMeter(t, drivertest.NewMeter(), MeterOptions{Accuracy: own})
		must(t, second(m.Configure(t.Context(), volts(10, 0.2))))
		s, err := m.Read(t.Context())
		must(t, err)
		if a := s.Accuracy; a.Reading != 120e-6 || a.Range != 40e-6 || a.Offset != 0 || math.Abs(a.Resolution-1e-5) > 1e-12 {
			t.Errorf("%+v", s.Accuracy)
		}
	})
	inBubble(t, "OverloadIsAnOutcome", func(t *testing.T) {
		f := drivertest.NewMeter()
		f.Input(-13, 0)
		m := openMeter(t, f, MeterOptions{})
		must(t, second(m.Configure(t.Context(), volts(10, 0.2))))
		s, err := m.Read(t.Context())
		must(t, err)
		if s.Outcome != instruments.Overload || !math.IsNaN(s.Value) || s.Raw != "-9.90000000E+37" {
			t.Errorf("%+v", s)
		}
	})
	inBubble(t, "TwoSecondsTwice", func(t *testing.T) {
		m := openMeter(t, drivertest.NewMeter(), MeterOptions{})
		must(t, second(m.Configure(t.Context(), volts(10, 2)))) // 100 PLC with auto-zero takes 4 s
		began := time.Now()
		must(t, second(m.Read(t.Context())))
		if took := time.Since(began); took < 4*time.Second {
			t.Errorf("a new reading took only %v", took)
		}
	})
	inBubble(t, "IsNewEachTime", func(t *testing.T) {
		f := drivertest.NewMeter()
		m := openMeter(t, f, MeterOptions{})
		must(t, second(m.Configure(t.Context(), volts(10, 0.02))))
		for _, v := range []float64{1, 2, 3} {
			f.Input(v, 0)
			if s, err := m.Read(t.Context()); err != nil || s.Value != v {
				t.Errorf("%v V reads %v, %v", v, s.Value, err)
			}
		}
	})
}

func TestMeterThatWasSwitchedOffAndOn(t *testing.T) {
	inBubble(t, "SettingsAreReadBack", func(t *testing.T) {
		f := drivertest.NewMeter()
		m := openMeter(t, f, MeterOptions{})
		must(t, second(m.Configure(t.Context(), volts(10, 0.02))))
		f.Unplug()
		f.PowerOn()
		_, err := m.Read(t.Context())
		if err == nil {
			t.Fatal("a reading over a cut link")
		}
		for range 3 { // the link is opened anew on the way
			if _, err = m.Read(t.Context()); err != nil && !isLink(err) {
				break
			}
		}
		wants(t, err, ErrSettingsLost, "meter average", "configure it again")
		_, err = m.Read(t.Context())
		wants(t, err, ErrNotConfigured)
	})
	inBubble(t, "ALateReplyAloneLosesNothing", func(t *testing.T) {
		f := drivertest.NewMeter()
		f.Input(3, 0)
		m := openMeter(t, f, MeterOptions{})
		must(t, second(m.Configure(t.Context(), volts(10, 0.02))))
		late := true
		f.Fate = func(msg string) drivertest.Fate {
			if msg == "READ?" && late {
				late = false
				return drivertest.Fate{Delay: 4 * time.Second, Reply: "+7.00000000E+00\n"}
			}
			return drivertest.Fate{}
		}
		_, err := m.Read(t.Context())
		wants(t, err, link.ErrTimeout)
		s, err := m.Read(t.Context())
		must(t, err)
		if s.Value != 3 {
			t.Errorf("the late 7 V was taken for %v", s.Value)
		}
	})
}

func TestTimeOutsOfAFastClock(t *testing.T) {
	d, err := dialect.Find(dialect.RoleMeter, "standard-meter")
	must(t, err)
	m := &Meter{instrument: instrument{d: d, clock: instruments.NewClock(100)}, set: volts(10, 2)}
	// 1.1 × 2 × 2 s + 0.3 s of bench time at pace 100, on top of a plain reply.
	if got := m.readingTime(); got != 47*time.Millisecond {
		t.Errorf("reading time %v", got)
	}
	if m.base() != 2*time.Second {
		t.Errorf("a plain reply is allowed %v at any pace", m.base())
	}
	s := &Scope{instrument: instrument{d: d, clock: instruments.NewClock(1000)}, set: instruments.ScopeSettings{Duration: 0.1}}
	if got := s.triggerTime(); got < triggerFloor {
		t.Errorf("a trigger is allowed %v", got)
	}
}

// isLink tells the faults of the way to the instrument.
func isLink(err error) bool {
	for _, kind := range []error{link.ErrLost, link.ErrTimeout, scpi.ErrOutOfStep} {
		if errors.Is(err, kind) {
			return true
		}
	}
	return false
}
