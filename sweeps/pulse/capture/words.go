package capture

import (
	"fmt"
	"strings"

	"nightbench/instruments/si"
)

var separatorWords = map[byte]string{'\t': "tabs between fields", ';': "semicolons between fields", ',': "commas between fields", ' ': "blanks between fields"}

// words says what the file was taken for.
func (t *table) words(roles []role, f File) string {
	var parts []string
	if len(t.cols) > 1 {
		parts = append(parts, separatorWords[t.sep])
	}
	if t.joined {
		parts = append(parts, "decimal commas")
	}
	switch t.first {
	case 0:
		parts = append(parts, "no header")
	case 1:
		parts = append(parts, "a header of one line")
	default:
		parts = append(parts, fmt.Sprintf("a header of %d lines", t.first))
	}
	k := 0
	for i, r := range roles {
		at := fmt.Sprintf("field %d", t.cols[i]+1)
		switch r {
		case times:
			parts = append(parts, "times in "+at+given(t.units[i], "s"))
		case counts:
			parts = append(parts, "sample numbers in "+at)
		case samples:
			c := f.Channels[k]
			k++
			parts = append(parts, c.Name+" in "+at+given(t.units[i], c.Unit))
		}
	}
	parts = append(parts, t.samplesInWords(f.Channels[0]))
	if t.cut {
		parts = append(parts, "the last line was cut short and left out")
	}
	if t.blank > 0 {
		parts = append(parts, fmt.Sprintf("what follows from line %d on is not samples and was left out", t.blank))
	}
	return strings.Join(parts, "; ")
}

// given is a unit in brackets, saying so when it was not given.
func given(u unit, si string) string {
	if u.factor == 0 {
		return " (no unit given: taken as " + si + ")"
	}
	for p, f := range prefixes {
		if f == u.factor && p != "u" && p != "μ" && p != "K" && u.si != "" {
			return " (" + p + u.si + ")"
		}
	}
	return " (" + u.si + ")"
}

func (t *table) samplesInWords(c Channel) string {
	r := c.Record
	n := len(r.Volts)
	switch {
	case c.Untimed:
		return fmt.Sprintf("%d samples, how far apart is not known", n)
	case r.Times != nil:
		return fmt.Sprintf("%d samples, on average %s apart", n, si.Format((r.Times[n-1]-r.Times[0])/float64(n-1), si.Second))
	}
	dt, key, ok := t.header.interval()
	if ok && dt == r.Interval {
		return fmt.Sprintf("%d samples, %s apart by the header's %s", n, si.Format(r.Interval, si.Second), t.header[key].said)
	}
	return fmt.Sprintf("%d samples, %s apart", n, si.Format(r.Interval, si.Second))
}
