package si

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func near(t *testing.T, name string, got, want float64) {
	t.Helper()
	if math.Abs(got-want) > 1e-12*math.Max(1e-12, math.Abs(want)) {
		t.Errorf("%s: got %g, want %g", name, got, want)
	}
}

// Written forms: IEC 60062 letter codes for R and C ("4k7", "2R2", "3n3"); SI
// brochure prefixes; the rest is how benches write it (common practice, no source).
func TestQuantitiesAsPeopleWriteThem(t *testing.T) {
	var r Resistance
	for text, want := range map[string]float64{
		"10k": 10e3, "4k7": 4700, "2R2": 2.2, "0.3": 0.3, "470": 470, "1M": 1e6, "100kΩ": 1e5, "100 kohm": 1e5, "12 Ω": 12, "10K": 1e4, "0R1": 0.1, "1e3": 1000, "47 R": 47,
	} {
		if err := r.UnmarshalText([]byte(text)); err != nil {
			t.Errorf("%q: %v", text, err)
		}
		near(t, text, r.SI(), want)
	}
	var c Capacitance
	for text, want := range map[string]float64{"100n": 100e-9, "100 nF": 100e-9, "3n3": 3.3e-9, "10uF": 10e-6, "10 µF": 10e-6, "1e-7": 1e-7} {
		if err := c.UnmarshalText([]byte(text)); err != nil {
			t.Errorf("%q: %v", text, err)
		}
		near(t, text, c.SI(), want)
	}
	var s Time
	for text, want := range map[string]float64{"250 ms": 0.25, "20 min": 1200, "9 h": 32400, "20 s": 20, "12us": 12e-6} {
		if err := s.UnmarshalText([]byte(text)); err != nil {
			t.Errorf("%q: %v", text, err)
		}
		near(t, text, s.SI(), want)
	}
	var j Inertia
	var k TorqueConstant
	var b ViscousTorque
	var tq Torque
	for _, x := range []struct {
		text string
		into interface{ UnmarshalText([]byte) error }
		si   func() float64
		want float64
	}{
		{"0.5 g cm2", &j, func() float64 { return j.SI() }, 0.5e-7},
		{"8 mV s/rad", &k, func() float64 { return k.SI() }, 8e-3},
		{"0.2 uN m s", &b, func() float64 { return b.SI() }, 0.2e-6},
		{"0.6 mN m", &tq, func() float64 { return tq.SI() }, 0.6e-3},
	} {
		if err := x.into.UnmarshalText([]byte(x.text)); err != nil {
			t.Errorf("%q: %v", x.text, err)
		}
		near(t, x.text, x.si(), x.want)
	}
}

func TestBareNumbersOnlyForRCLAndRatios(t *testing.T) {
	var v Voltage
	var i Current
	var s Time
	for _, err := range []error{v.UnmarshalText([]byte("9")), i.UnmarshalText([]byte("0.5")), s.UnmarshalText([]byte("20"))} {
		if err == nil || !strings.Contains(err.Error(), "has no unit; write") {
			t.Errorf("a bare number passed, or without a hint: %v", err)
		}
	}
	var r Ratio
	if err := r.UnmarshalText([]byte("0.25")); err != nil || r.SI() != 0.25 {
		t.Errorf("ratio: %v %v", r, err)
	}
	for _, bad := range []string{"9 mA", "9 VV", "nine volts", "", "nan V", "inf V", "0x10 V", "9 v", "1e999 V", "9,5 V"} {
		if err := v.UnmarshalText([]byte(bad)); err == nil {
			t.Errorf("%q passed as a voltage: %v", bad, v)
		}
	}
}

func TestTolerances(t *testing.T) {
	var r Toleranced[ohm]
	if err := r.UnmarshalText([]byte("4k7 1%")); err != nil || r.SI() != 4700 || r.Tolerance != 0.01 || r.Normal {
		t.Errorf("got %+v, %v", r, err)
	}
	if err := r.UnmarshalText([]byte("100k 20 % normal")); err == nil {
		t.Error("a tolerance split from its % passed silently")
	}
	if err := r.UnmarshalText([]byte("100k 20% normal")); err != nil || !r.Normal || r.Tolerance != 0.2 {
		t.Errorf("got %+v, %v", r, err)
	}
	var l Toleranced[henry]
	if err := l.UnmarshalText([]byte("5 mH 20%")); err != nil || l.SI() != 5e-3 {
		t.Errorf("got %+v, %v", l, err)
	}
}

func TestLimits(t *testing.T) {
	var l Limit
	for _, x := range []struct {
		text     string
		at, want float64
	}{{"2 % or 0.1 V", 9, 0.18}, {"2 % or 0.1 V", 1, 0.1}, {"1 points", 0.5, 0.01}, {"1.5 points", 0.5, 0.015}, {"10 % or 5 mA", 0.02, 0.005}, {"5 %", 1000, 50}} {
		if err := l.UnmarshalText([]byte(x.text)); err != nil {
			t.Errorf("%q: %v", x.text, err)
		}
		near(t, x.text, l.Of(x.at), x.want)
	}
	for _, bad := range []string{"2", "0.1 furlongs", "", "2 % or", "-1 V"} {
		if err := l.UnmarshalText([]byte(bad)); err == nil {
			t.Errorf("%q passed as a limit", bad)
		}
	}
}

// Parentheses notation: JCGM 100:2008 7.2.2, e.g. 100.02147(35) g there.
func TestUncertaintyInParentheses(t *testing.T) {
	for _, x := range []struct {
		v, u float64
		unit Unit
		want string
	}{
		{4.3524, 0.012, Volt, "4.352(12) V"},
		{100.02147, 0.00035, "g", "100.02147(35) g"},
		{0.0521, 0.001, Ampere, "52.1(10) mA"},
		{21560, 110, Ohm, "21.56(11) kΩ"},
		{-0.36, 0.03, Volt, "−360(30) mV"},
		{0.353, 0.002, One, "0.3530(20)"},
		{5, 0, Volt, "5 V"},
		{12.3, 1.5, Hertz, "12.3(15) Hz"},
		{math.NaN(), 1, Volt, "no value"},
		{0.0001, 0.02, Volt, "0(20) mV"},
	} {
		if got := strings.ReplaceAll(FormatU(x.v, x.u, x.unit), nbsp, " "); got != x.want {
			t.Errorf("FormatU(%g, %g): got %q, want %q", x.v, x.u, got, x.want)
		}
	}
}

func TestPrintedQuantitiesParseBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.Float64Range(-1e6, 1e6).Draw(t, "x")
		text, _ := Volts(x).MarshalText()
		var back Voltage
		if err := back.UnmarshalText(text); err != nil {
			t.Fatalf("%q: %v", text, err)
		}
		if math.Abs(back.SI()-x) > 1e-4*math.Abs(x)+1e-15 {
			t.Fatalf("%q came back as %g, was %g", text, back.SI(), x)
		}
	})
}

func TestRangesShareAPrefix(t *testing.T) {
	for _, x := range []struct {
		low, high float64
		unit      Unit
		want      string
	}{
		{4649.7, 5336.8, Hertz, "4.650 to 5.337 kHz"},
		{843.75, 1193.9, Hertz, "0.844 to 1.194 kHz"},
		{0.025038, 0.0253672, Volt, "25.04 to 25.37 mV"},
		{0.14853, 0.20607, One, "0.149 to 0.206"},
		{-1, 250, Volt, "−1.0 to 250.0 V"},
		{math.NaN(), 1, Volt, "no value"},
	} {
		if got := strings.ReplaceAll(FormatRange(x.low, x.high, x.unit), nbsp, " "); got != x.want {
			t.Errorf("FormatRange(%g, %g): got %q, want %q", x.low, x.high, got, x.want)
		}
	}
}
