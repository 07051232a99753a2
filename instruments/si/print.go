package si

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// nbsp stands between a number and its unit, so that they are never parted at a line's end.
const nbsp = "\u00a0"

// Format prints x with an engineering prefix and up to five figures: "4.7 kΩ", "250 mA".
// Ratios are printed plain. Numbers that are none print as "no value".
func Format(x float64, u Unit) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return "no value"
	}
	p, f := prefixFor(x, u)
	return tidy(strconv.FormatFloat(round(x/f, 5), 'f', -1, 64)) + suffix(p, u)
}

// FormatU prints x with its standard uncertainty in parentheses on the last
// digits, two figures of u (GUM 7.2.2): "4.352(12) V". A u of zero prints x alone.
func FormatU(x, u float64, unit Unit) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return "no value"
	}
	if !(u > 0) || math.IsInf(u, 0) {
		return Format(x, unit)
	}
	p, f := prefixFor(math.Max(math.Abs(x), u), unit)
	x, u = x/f, u/f
	dec := 1 - int(math.Floor(math.Log10(u)))
	if math.Round(u*math.Pow10(dec)) >= 100 {
		dec--
	}
	if dec < 0 {
		scale := math.Pow10(-dec)
		return tidy(fmt.Sprintf("%.0f(%.0f)", math.Round(x/scale)*scale, math.Round(u/scale)*scale)) + suffix(p, unit)
	}
	paren := strconv.FormatFloat(math.Round(u*math.Pow10(dec)), 'f', 0, 64)
	return tidy(strconv.FormatFloat(x, 'f', dec, 64)) + "(" + paren + ")" + suffix(p, unit)
}

// prefixFor picks the engineering prefix for x and its factor.
func prefixFor(x float64, u Unit) (string, float64) {
	a := math.Abs(x)
	if !takesPrefix(u) || a == 0 {
		return "", 1
	}
	for _, p := range []struct {
		s string
		f float64
	}{{"G", 1e9}, {"M", 1e6}, {"k", 1e3}, {"", 1}, {"m", 1e-3}, {"µ", 1e-6}, {"n", 1e-9}} {
		if a >= p.f*0.9999995 {
			return p.s, p.f
		}
	}
	return "p", 1e-12
}

func takesPrefix(u Unit) bool {
	switch u {
	case One, Celsius, RadianPerSec, KilogramMetre2:
		return false
	}
	return true
}

func suffix(prefix string, u Unit) string {
	if u == One {
		return ""
	}
	return nbsp + prefix + string(u)
}

// round keeps n significant figures.
func round(x float64, n int) float64 {
	if x == 0 {
		return 0
	}
	y, err := strconv.ParseFloat(strconv.FormatFloat(x, 'e', n-1, 64), 64)
	if err != nil {
		return x
	}
	return y
}

// tidy writes a true minus sign.
func tidy(s string) string { return strings.Replace(s, "-", "−", 1) }

// Percent prints a share in percent, three figures: "35.2 %".
func Percent(share float64) string {
	return tidy(strconv.FormatFloat(round(100*share, 3), 'f', -1, 64)) + nbsp + "%"
}

// FormatRange prints an interval with one prefix for both ends, four figures: "4.650 to 5.337 kHz".
func FormatRange(low, high float64, u Unit) string {
	if math.IsNaN(low) || math.IsInf(low, 0) || math.IsNaN(high) || math.IsInf(high, 0) {
		return "no value"
	}
	p, f := prefixFor(math.Max(math.Abs(low), math.Abs(high)), u)
	dec := 3
	if m := math.Max(math.Abs(low), math.Abs(high)) / f; m >= 1 {
		dec = max(0, 3-int(math.Log10(m)))
	}
	one := func(x float64) string { return tidy(strconv.FormatFloat(x/f, 'f', dec, 64)) }
	return one(low) + " to " + one(high) + suffix(p, u)
}

// Short prints a resistance as people write it in a sentence, figures and prefix: "22 k"; a unit only where there is no prefix: "470 Ω".
func Short(ohms float64) string {
	p, f := prefixFor(ohms, Ohm)
	s := tidy(strconv.FormatFloat(round(ohms/f, 3), 'f', -1, 64))
	if p == "" {
		return s + nbsp + string(Ohm)
	}
	return s + nbsp + p
}
