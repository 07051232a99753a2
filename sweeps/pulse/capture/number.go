package capture

import (
	"bytes"
	"math"
	"strconv"
	"strings"
)

// splitFields cuts a line at the separator, outside of quotes, and trims the
// fields; a separator of ' ' is any run of blanks. fields is reused.
func splitFields(line []byte, sep byte, fields [][]byte) [][]byte {
	fields = fields[:0]
	if sep == ' ' {
		return append(fields, bytes.Fields(line)...)
	}
	for {
		end, quoted := 0, false
		for end < len(line) && (quoted || line[end] != sep) {
			if line[end] == '"' {
				quoted = !quoted
			}
			end++
		}
		fields = append(fields, trim(line[:end]))
		if end == len(line) {
			return fields
		}
		line = line[end+1:]
	}
}

func trim(f []byte) []byte {
	f = bytes.TrimSpace(f)
	if len(f) >= 2 && f[0] == '"' && f[len(f)-1] == '"' {
		f = bytes.TrimSpace(f[1 : len(f)-1])
	}
	return f
}

// number reads a field: point or comma as decimal sign, overload as an infinity,
// a time of day as seconds, a value with its unit behind it in SI. A field that
// holds both point and comma is none: which is which cannot be told.
func number(field []byte) (float64, bool) {
	if len(field) == 0 || len(field) > 64 {
		return 0, false
	}
	if c := field[0]; c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' {
		return overload(string(field))
	}
	s := string(field)
	if i := strings.IndexByte(s, ','); i >= 0 {
		if strings.IndexByte(s, '.') >= 0 || strings.IndexByte(s[i+1:], ',') >= 0 {
			return 0, false
		}
		s = s[:i] + "." + s[i+1:]
	}
	if x, err := strconv.ParseFloat(s, 64); err == nil && !hexOrSpaced(s) {
		return settle(x), true
	}
	return oddNumber(s)
}

// hexOrSpaced tells numbers only a programmer writes.
func hexOrSpaced(s string) bool { return strings.ContainsAny(s, "xX_pP") }

// settle makes an overload of the number that stands for it in SCPI replies, 9.9E37.
func settle(x float64) float64 {
	if math.Abs(x) >= 9e36 {
		return math.Inf(int(math.Copysign(1, x)))
	}
	return x
}

func overload(s string) (float64, bool) {
	switch strings.ToLower(s) {
	case "inf", "infinity", "ol", "ovl", "overload", "overflow":
		return math.Inf(1), true
	}
	return 0, false
}

func oddNumber(s string) (float64, bool) {
	if rest, ok := strings.CutPrefix(s, "\u2212"); ok {
		s = "-" + rest
	}
	switch s {
	case "∞", "+∞":
		return math.Inf(1), true
	case "-∞":
		return math.Inf(-1), true
	}
	if strings.IndexByte(s, ':') > 0 {
		return clock(s)
	}
	x, rest := leading(s)
	if rest == "" || rest == s {
		return x, rest == "" && s != ""
	}
	u, ok := unitOf(rest)
	return x * u.factor, ok
}

// leading cuts the number at the front of s from what follows it.
func leading(s string) (x float64, rest string) {
	end := 0
	for end < len(s) && (s[end] >= '0' && s[end] <= '9' || strings.IndexByte("+-.eE", s[end]) >= 0) {
		end++
	}
	for ; end > 0; end-- {
		if x, err := strconv.ParseFloat(s[:end], 64); err == nil {
			return x, strings.TrimSpace(s[end:])
		}
	}
	return 0, s
}

// lastDigit is the place value of a number's last digit: 0.01 of "8.92", 10 of "8.92e3"; 0 of a whole number.
func lastDigit(field []byte) float64 {
	decimals, exponent, point := 0, 0, false
	for i, c := range field {
		switch {
		case c == '.' || c == ',':
			point = true
		case c == 'e' || c == 'E':
			exponent, _ = strconv.Atoi(string(field[i+1:])) // a number, as it was read as one
			if !point {
				return 0
			}
			return math.Pow10(exponent - decimals)
		case c < '0' || c > '9':
			if i > 0 {
				return 0
			}
		case point:
			decimals++
		}
	}
	if !point {
		return 0
	}
	return math.Pow10(-decimals)
}

// clock reads a time of day, after a date perhaps, as seconds since midnight.
func clock(s string) (float64, bool) {
	if i := strings.LastIndexAny(s, " T"); i >= 0 {
		s = s[i+1:]
	}
	parts := strings.Split(s, ":")
	if len(parts) < 2 || len(parts) > 3 {
		return 0, false
	}
	var t float64
	for _, p := range parts {
		x, err := strconv.ParseFloat(p, 64)
		if err != nil || x < 0 || x >= 100 || hexOrSpaced(p) {
			return 0, false
		}
		t = 60*t + x
	}
	if len(parts) == 2 {
		return t, true // minutes and seconds
	}
	return t, true
}

// unit is what a column is in: its SI unit and the factor to it.
type unit struct {
	si     string // "s", "V", "A", "Hz"; "" of a plain number
	factor float64
}

var prefixes = map[string]float64{"": 1, "p": 1e-12, "n": 1e-9, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "m": 1e-3, "k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9}

var spelled = map[string]string{
	"s": "s", "sec": "s", "secs": "s", "second": "s", "seconds": "s", "V": "V", "v": "V", "volt": "V", "volts": "V", "A": "A", "amp": "A", "amps": "A", "ampere": "A", "amperes": "A",
	"Hz": "Hz", "hz": "Hz", "hertz": "Hz", "Sa/s": "Hz", "S/s": "Hz", "sa/s": "Hz", "samples/s": "Hz", "Sps": "Hz", "sps": "Hz", "SPS": "Hz",
}

// unitOf reads a unit's symbol or name, brackets around it allowed.
func unitOf(s string) (unit, bool) {
	s = strings.Trim(strings.TrimSpace(s), "()[]{} ")
	for prefix, factor := range prefixes {
		rest, ok := strings.CutPrefix(s, prefix)
		if !ok {
			continue
		}
		if si, ok := spelled[rest]; ok {
			return unit{si, factor}, true
		}
	}
	if si, ok := spelled[strings.ToLower(s)]; ok && len(s) > 1 {
		return unit{si, 1}, true
	}
	switch strings.ToLower(s) {
	case "millisecond", "milliseconds", "msec":
		return unit{"s", 1e-3}, true
	case "microsecond", "microseconds", "usec":
		return unit{"s", 1e-6}, true
	case "nanosecond", "nanoseconds", "nsec":
		return unit{"s", 1e-9}, true
	case "millivolt", "millivolts":
		return unit{"V", 1e-3}, true
	}
	return unit{}, false
}
