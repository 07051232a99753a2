package figure

import (
	"fmt"
	"slices"
	"strings"

	"nightbench/instruments/si"
)

// waveform draws every sample joined by straight lines, or of many samples the span of
// values in each px.
func (s *scene) waveform() {
	n := s.to - s.from + 1
	columns := int(width - left - right)
	var d strings.Builder
	d.WriteByte('M')
	if n <= 2*columns {
		for i := s.from; i <= s.to; i++ {
			fmt.Fprintf(&d, "%.1f %.1f ", s.x(s.Record.At(i)), s.y(s.Record.Volt(i)))
		}
	} else {
		for c := range columns {
			a, b := s.from+c*n/columns, s.from+(c+1)*n/columns
			low, high := s.Record.Volt(a), s.Record.Volt(a)
			first, last := low, s.Record.Volt(b-1)
			for i := a; i < b; i++ {
				v := s.Record.Volt(i)
				low, high = min(low, v), max(high, v)
			}
			x := s.x(s.Record.At(a))
			for _, v := range []float64{first, low, high, last} {
				fmt.Fprintf(&d, "%.1f %.1f ", x, s.y(v))
			}
		}
	}
	fmt.Fprintf(s.b, `<path class="ink" d="%s"/>`+"\n", strings.TrimSpace(d.String()))
}

// level is a measured level to be drawn.
type level struct {
	words string
	y, at float64 // where it lies, and where its words stand
}

// levels draws each level as a broken line with its name and value at the right.
func (s *scene) levels() {
	var all []level
	for _, name := range []string{"high_level", "back_emf", "low_level", "level", "average_voltage"} {
		if q, ok := s.Result.Get(name); ok && q.X >= s.low && q.X <= s.high {
			words := strings.TrimSuffix(strings.ReplaceAll(name, "_", " "), " voltage") + " " + si.FormatU(q.X, q.U(), si.Unit(s.Unit))
			all = append(all, level{words, s.y(q.X), s.y(q.X)})
		}
	}
	if len(s.Result.Instants) > 0 {
		y := s.y(s.Result.Middle)
		all = append(all, level{"50 % " + si.Format(s.Result.Middle, si.Unit(s.Unit)), y, y})
	}
	slices.SortFunc(all, func(a, b level) int { return int(10 * (a.y - b.y)) })
	for i := range all {
		if i > 0 {
			all[i].at = max(all[i].at, all[i-1].at+15)
		}
		line(s.b, "level", left, all[i].y, width-right, all[i].y)
		line(s.b, "hair", width-right, all[i].y, width-right+8, all[i].at)
		text(s.b, width-right+12, all[i].at+4, "", "", all[i].words)
	}
}

// instants marks where the waveform passes the 50 % reference level.
func (s *scene) instants() {
	for _, e := range s.Result.Instants {
		if e.T < s.t0 || e.T > s.t1 {
			continue
		}
		way := "falls"
		if e.Rising {
			way = "rises"
		}
		fmt.Fprintf(s.b, `<circle class="dot" cx="%.1f" cy="%.1f" r="2.5"><title>%s at %s</title></circle>`+"\n",
			s.x(e.T), s.y(s.Result.Middle), way, esc(s.time(e.T)))
	}
}

func (s *scene) time(t float64) string {
	if s.Untimed {
		return fmt.Sprintf("sample %.2f", t)
	}
	return si.Format(t, si.Second)
}

// brackets spans under the trace one high state and one whole period, with their values.
func (s *scene) brackets() {
	edges := s.Result.Instants
	for k := 0; k+2 < len(edges); k++ {
		if !edges[k].Rising || edges[k].T < s.t0 || edges[k+2].T > s.t1 {
			continue
		}
		s.bracket(edges[k].T, edges[k+1].T, 12, "t_high")
		s.bracket(edges[k].T, edges[k+2].T, 30, "period")
		return
	}
}

func (s *scene) bracket(from, to, below float64, name string) {
	q, ok := s.Result.Get(name)
	if !ok {
		return
	}
	y, a, b := top+trace+below, s.x(from), s.x(to)
	fmt.Fprintf(s.b, `<path class="hair" d="M%.1f %.1fv5H%.1fv-5"/>`+"\n", a, y-5, b)
	words := strings.ReplaceAll(name, "_", " ") + " " + si.FormatU(q.X, q.U(), si.Second)
	if name == "t_high" {
		if d, ok := s.Result.Get("duty"); ok {
			words += ", duty " + si.FormatU(d.X, d.U(), si.One)
		}
	}
	text(s.b, b+8, y+4, "", "", words)
}

// wrap breaks words into lines of at most n characters where it can.
func wrap(words string, n int) (lines []string) {
	line := ""
	for w := range strings.FieldsSeq(words) {
		if line != "" && len(line)+1+len(w) > n {
			lines = append(lines, line)
			line = ""
		}
		if line != "" {
			line += " "
		}
		line += w
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}
