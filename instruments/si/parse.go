package si

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// prefixes are the decimal prefixes taken before a unit or, where a bare number is taken, after it ("10k", "4n7").
var prefixes = map[string]float64{
	"f": 1e-15, "p": 1e-12, "n": 1e-9, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "m": 1e-3, "k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9,
}

// parse reads one quantity of the given dimension.
func parse(text string, sp spec) (float64, error) {
	s := strings.Replace(strings.TrimSpace(text), "−", "-", 1)
	digits, rest := splitNumber(s)
	x, err := number(digits)
	if err != nil {
		return 0, fmt.Errorf("%q is not %s; write it like %q", text, sp.kind, sp.like)
	}
	rest = strings.Join(strings.Fields(rest), " ")
	if v, ok := infixed(x, digits, rest, sp); ok {
		return v, nil
	}
	factor, ok := sp.factor(rest)
	if !ok {
		return 0, sp.refuse(text, rest)
	}
	v := x * factor
	if math.IsInf(v, 0) {
		return 0, fmt.Errorf("%q is too large for %s", text, sp.kind)
	}
	return v, nil
}

// factor is the factor to SI of what stands behind the number.
func (sp spec) factor(rest string) (float64, bool) {
	if rest == "" {
		return 1, sp.bare
	}
	for _, u := range sp.spell {
		if rest == u.text {
			return u.factor, true
		}
	}
	for p, f := range prefixes {
		tail, ok := strings.CutPrefix(rest, p)
		if !ok {
			continue
		}
		if tail == "" && sp.bare && sp.unit != One {
			return f, true
		}
		for _, u := range sp.spell {
			if u.prefixed && strings.TrimSpace(tail) == u.text {
				return f * u.factor, true
			}
		}
	}
	return 0, false
}

// refuse says which unit was missing or wrong.
func (sp spec) refuse(text, rest string) error {
	if rest == "" {
		return fmt.Errorf("%q has no unit; write %s like %q", text, sp.kind, sp.like)
	}
	return fmt.Errorf("%q has an unknown unit %q for %s; write it like %q (prefixes f p n u m k M G)", text, rest, sp.kind, sp.like)
}

// infixed reads the letter-for-point form: "4k7", "2R2", "3n3".
func infixed(x float64, digits, rest string, sp spec) (float64, bool) {
	if !sp.bare || sp.unit == One || strings.ContainsAny(digits, ".eE") || rest == "" {
		return 0, false
	}
	for p, f := range prefixesAndR(sp) {
		tail, ok := strings.CutPrefix(rest, p)
		if !ok || tail == "" || strings.Trim(tail, "0123456789") != "" {
			continue
		}
		frac, err := strconv.ParseFloat("0."+tail, 64)
		if err != nil {
			return 0, false
		}
		if x < 0 || strings.HasPrefix(digits, "-") {
			frac = -frac
		}
		return (x + frac) * f, true
	}
	return 0, false
}

func prefixesAndR(sp spec) map[string]float64 {
	if sp.unit != Ohm {
		return prefixes
	}
	m := map[string]float64{"R": 1}
	for p, f := range prefixes {
		m[p] = f
	}
	return m
}

// splitNumber cuts s behind its leading decimal number.
func splitNumber(s string) (digits, rest string) {
	i := 0
	for i < len(s) && (s[i] >= '0' && s[i] <= '9' || s[i] == '.' || (i == 0 && (s[i] == '-' || s[i] == '+'))) {
		i++
	}
	if j := exponent(s[i:]); j > 0 && i > 0 {
		i += j
	}
	return s[:i], s[i:]
}

// exponent is the length of "e-12" at the start of s, or 0.
func exponent(s string) int {
	if len(s) < 2 || (s[0] != 'e' && s[0] != 'E') {
		return 0
	}
	i := 1
	if s[i] == '-' || s[i] == '+' {
		i++
	}
	j := i
	for j < len(s) && s[j] >= '0' && s[j] <= '9' {
		j++
	}
	if j == i {
		return 0
	}
	return j
}

// number reads a plain decimal number; "nan", "inf" and hexadecimal forms are not numbers here.
func number(s string) (float64, error) {
	if s == "" || strings.Trim(s, "0123456789.eE+-") != "" {
		return 0, fmt.Errorf("%q is not a number", s)
	}
	return strconv.ParseFloat(s, 64)
}
