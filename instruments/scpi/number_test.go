package scpi

import (
	"errors"
	"math"
	"testing"

	"pgregory.net/rapid"
)

func TestParseNumber(t *testing.T) {
	for _, c := range []struct {
		text    string
		value   float64
		outcome Outcome
		source  string
	}{
		{"-12", -12, Measured, "NR1, Agilent N1911A programming guide p. 75"},
		{"+5", 5, Measured, "NR1, same"},
		{"-1.25", -1.25, Measured, "NR2, same"},
		{".5", .5, Measured, "NRf, same"},
		{"5.", 5, Measured, "NRf, same"},
		{"+1.25E-03", 1.25e-3, Measured, "NR3, same"},
		{"-1.04530000E+00", -1.0453, Measured, "SD.DDDDDDDDESDD, HP 34401A User's Guide p. 159"},
		{"5.097E-001", 0.5097, Measured, "Pendulum CNT-90 p. 8-64"},
		{"+9.90000000E+37", math.NaN(), Overload, "HP 34401A, from memory"},
		{"-9.90000000E+37", math.NaN(), Overload, "HP 34401A, from memory"},
		{"9.9e37", math.NaN(), Overload, "Rigol DS2000E p. 2-166"},
		{"9.91E37", math.NaN(), NotANumber, "SCPI-1999 NAN, N1911A p. 75"},
		{"9.91000E+37", math.NaN(), NotANumber, "same"},
		{"9.99999E+37", math.NaN(), NoMeasurement, "Infiniium 90000 p. 444, stopped before complete"},
		{"9.99999E+35", math.NaN(), NoMeasurement, "ADCMT 6241A p. 6-21"},
		{"1E30", math.NaN(), NoMeasurement, "no quantity of a bench reaches it"},
		{"9.99E29", 9.99e29, Measured, "just below"},
		{"1E999", math.NaN(), NoMeasurement, "beyond float64"},
	} {
		n, err := ParseNumber(c.text)
		same := n.Value == c.value || math.IsNaN(n.Value) && math.IsNaN(c.value)
		if err != nil || !same || n.Outcome != c.outcome || n.Raw != c.text {
			t.Errorf("%q: %+v, %v; want %v %v (%s)", c.text, n, err, c.outcome, c.value, c.source)
		}
		if n.Negative != (c.text[0] == '-') {
			t.Errorf("%q: negative %v", c.text, n.Negative)
		}
	}
}

func TestParseNumberRefuses(t *testing.T) {
	for _, text := range []string{"", " ", "abc", "5,0", "9,9E37", "5.00V", "5 V", "1.2.3", "--5", "5E", "0x10", "1_000",
		"NaN", "Inf", "****", "1E+3 5", "1;2", "+", ".", "E5", "5e+"} {
		if n, err := ParseNumber(text); !errors.Is(err, ErrForm) || !math.IsNaN(n.Value) || n.Outcome == Measured {
			t.Errorf("%q: %+v, %v; want ErrForm", text, n, err)
		}
	}
}

func TestNumberForm(t *testing.T) {
	f := NumberForm{Units: []string{"V", "S"}, NoValue: []string{"****"}, InfinityIsNoMeasurement: true}
	for _, c := range []struct {
		text, unit string
		outcome    Outcome
		value      float64
	}{
		{"5.00V", "V", Measured, 5},        // Aim-TTi CPX200D p. 28
		{"3.6E-9S", "S", Measured, 3.6e-9}, // Siglent SDS1104X-E p. 142
		{"5.00 V", "V", Measured, 5},
		{"****", "", NoMeasurement, math.NaN()}, // Siglent, from memory
		{"9.9E+37", "", NoMeasurement, math.NaN()},
	} {
		n, err := f.Parse(c.text)
		if err != nil || n.Unit != c.unit || n.Outcome != c.outcome || !(n.Value == c.value || math.IsNaN(c.value) && math.IsNaN(n.Value)) {
			t.Errorf("%q: %+v, %v", c.text, n, err)
		}
	}
	for _, text := range []string{"5 mV", "5v", "5A", "***"} {
		if _, err := f.Parse(text); !errors.Is(err, ErrForm) {
			t.Errorf("%q: %v, want ErrForm", text, err)
		}
	}
	if s := NotANumber.String() + ", " + NoMeasurement.String(); s != "not a number, no measurement" {
		t.Error(s)
	}
}

// What FormatNumber spells, both the client and the listener read back
// exactly.
func TestNumberRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(-1e29, 1e29).Draw(t, "v")
		if rapid.Bool().Draw(t, "small") {
			v *= 1e-29
		}
		text := FormatNumber(v)
		n, err := ParseNumber(text)
		if err != nil || n.Value != v {
			t.Fatalf("%v → %q → %+v, %v", v, text, n, err)
		}
		u, ok, err := NewParser([]byte("A " + text)).Next()
		if err != nil || !ok || len(u.Params) != 1 || u.Params[0].Value != v || u.Params[0].Suffix != "" {
			t.Fatalf("%v → %q → %+v, %v", v, text, u, err)
		}
	})
}

func TestQuotedRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		text := rapid.StringMatching(`[ -~]*`).Draw(t, "text")
		quoted := FormatString(text)
		if back, err := ParseString(quoted); err != nil || back != text {
			t.Fatalf("%q → %s → %q, %v", text, quoted, back, err)
		}
		u, ok, err := NewParser([]byte("A " + quoted)).Next()
		if err != nil || !ok || len(u.Params) != 1 || u.Params[0].Text != text {
			t.Fatalf("%q → %s → %+v, %v", text, quoted, u, err)
		}
		if parts := SplitList(quoted + "," + quoted); len(parts) != 2 || parts[0] != quoted {
			t.Fatalf("%s split into %q", quoted, parts)
		}
	})
}

func TestParseStringRefuses(t *testing.T) {
	for _, text := range []string{``, `"`, `abc`, `"abc`, `"a"b"`, `'a"`} {
		if s, err := ParseString(text); !errors.Is(err, ErrForm) {
			t.Errorf("%s: %q, %v; want ErrForm", text, s, err)
		}
	}
	if s, err := ParseString(`'it''s "so"'`); err != nil || s != `it's "so"` {
		t.Errorf("got %q, %v", s, err)
	}
}

func TestParseBool(t *testing.T) {
	words := map[string]bool{"YES": true, "NO": false}
	if b, err := ParseBool(" yes", words); err != nil || !b {
		t.Errorf("yes: %v, %v", b, err)
	}
	if _, err := ParseBool("1", words); !errors.Is(err, ErrForm) {
		t.Errorf("1: %v, want ErrForm", err)
	}
}

func TestSplitList(t *testing.T) {
	got := SplitList(`"VOLT 10,0.003", (@1,2) ,CH1`)
	if len(got) != 3 || got[0] != `"VOLT 10,0.003"` || got[1] != "(@1,2)" || got[2] != "CH1" {
		t.Errorf("got %q", got)
	}
}

func TestParseIdentity(t *testing.T) {
	for _, c := range []struct{ text, maker, model, serial, firmware, source string }{
		{"HEWLETT-PACKARD,34401A,0,11-5-2", "HEWLETT-PACKARD", "34401A", "0", "11-5-2", "HP 34401A, from memory"},
		{"KEITHLEY INSTRUMENTS INC., MODEL 2000, 1234567, A19/A02", "KEITHLEY INSTRUMENTS INC.", "MODEL 2000", "1234567", "A19/A02", "Keithley 2000 ch. 4"},
		{"A,B,C,1.0,beta", "A", "B", "C", "1.0,beta", "a comma in the firmware"},
		{"KORAD KC3405 V1.0 SN:12345678", "", "", "", "", "Korad KC3405 protocol sheet"},
	} {
		id := ParseIdentity(c.text)
		if id.Maker != c.maker || id.Model != c.model || id.Serial != c.serial || id.Firmware != c.firmware || id.Raw != c.text {
			t.Errorf("%q: %+v (%s)", c.text, id, c.source)
		}
	}
}
