// Package figure draws a captured waveform with what was found in it: the state
// levels with their names and values, the instants at the 50 % reference level, and
// brackets under the trace for the measured times. Ink on paper, no legend; every
// mark has its words beside it.
package figure

import (
	"bytes"
	"fmt"
	"html"
	"io"
	"math"

	"nightbench/instruments/si"
	"nightbench/sweeps/pulse"
)

// Panel is one waveform to draw.
type Panel struct {
	Name    string
	Unit    string // of the samples: "V", "A"
	Untimed bool   // times are in samples
	Record  pulse.Record
	Result  pulse.Result
}

// Sizes in px of the drawing.
const (
	width    = 960.0
	left     = 64.0
	right    = 236.0 // room for the levels' names and values
	top      = 62.0
	trace    = 220.0
	foot     = 92.0 // brackets, axis
	panel    = top + trace + foot
	mostSeen = 8 // whole periods; of a longer record the first few are drawn
	drawn    = 6
)

// style has the colours by day and by night; what they mean is always said in words too.
const style = `<style>
svg{background:#FAF7EF;color:#1C2027;font:12.5px/17px "DejaVu Sans",Arial,sans-serif;font-variant-numeric:tabular-nums lining-nums}
text{fill:currentColor}.soft{fill:#4B4A48}.title{font-weight:600}.flag{font-style:italic}
.ink{fill:none;stroke:currentColor;stroke-width:1.25;stroke-linejoin:round}.hair{fill:none;stroke:#8F897B;stroke-width:.75}.level{fill:none;stroke:#635F57;stroke-width:.75;stroke-dasharray:5 4}.dot{fill:currentColor}
@media (prefers-color-scheme:dark){svg{background:#1C1A17;color:#EBE4D6}.soft{fill:#C0B8A9}.hair{stroke:#7D766A}.level{stroke:#A39C8E}}
</style>`

// Write draws the panels one under the other as an SVG document; title and note head it.
func Write(w io.Writer, title, note string, panels []Panel) error {
	var b bytes.Buffer
	head := 34.0
	lines := wrap(note, 150)
	head += 17 * float64(len(lines))
	height := head + panel*float64(len(panels))
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %g %g" width="%g" height="%g" role="img">`+"\n%s\n", width, height, width, height, style)
	fmt.Fprintf(&b, "<title>%s</title>\n", esc(title))
	text(&b, left, 24, "title", "", title)
	for i, l := range lines {
		text(&b, left, 41+17*float64(i), "soft", "", l)
	}
	for i, p := range panels {
		fmt.Fprintf(&b, `<g transform="translate(0 %g)">`+"\n", head+panel*float64(i))
		newScene(&b, p).draw()
		b.WriteString("</g>\n")
	}
	b.WriteString("</svg>\n")
	_, err := w.Write(b.Bytes())
	return err
}

// scene is one panel with its scales.
type scene struct {
	Panel
	b         *bytes.Buffer
	from, to  int     // samples drawn, ends included
	t0, t1    float64 // s
	low, high float64 // V
	whole     bool    // the whole record is drawn
}

func newScene(b *bytes.Buffer, p Panel) *scene {
	s := &scene{Panel: p, b: b, to: p.Record.Len() - 1, whole: true}
	if edges := p.Result.Instants; p.Result.Periods > mostSeen && len(edges) > 2*drawn {
		s.whole = false
		half := (edges[2].T - edges[0].T) / 2
		s.from = p.Record.Index(edges[0].T - half)
		s.to = p.Record.Index(edges[2*drawn].T + half)
	}
	s.t0, s.t1 = p.Record.At(s.from), p.Record.At(s.to)
	s.low, s.high = math.Inf(1), math.Inf(-1)
	for i := s.from; i <= s.to; i++ {
		v := p.Record.Volt(i)
		s.low, s.high = min(s.low, v), max(s.high, v)
	}
	margin := 0.06 * (s.high - s.low)
	if margin == 0 {
		margin = max(1e-3, 0.1*math.Abs(s.high))
	}
	s.low, s.high = s.low-margin, s.high+margin
	return s
}

func (s *scene) x(t float64) float64 { return left + (t-s.t0)/(s.t1-s.t0)*(width-left-right) }
func (s *scene) y(v float64) float64 { return top + trace - (v-s.low)/(s.high-s.low)*trace }

func (s *scene) draw() {
	s.heading()
	s.axes()
	s.levels()
	s.waveform()
	s.instants()
	s.brackets()
}

// heading is the quantity and unit at the top left, under it what the waveform is.
func (s *scene) heading() {
	text(s.b, left, 20, "title", "", s.Name+", "+s.Unit)
	words := string(s.Result.Class)
	if n := s.Result.Periods; n > 0 {
		words += fmt.Sprintf(", %d whole periods", n)
		if n == 1 {
			words = string(s.Result.Class) + ", one whole period"
		}
	}
	if !s.whole {
		words += fmt.Sprintf("; the first %d are drawn", drawn)
	}
	text(s.b, left, 37, "soft", "", words)
	var names string
	for i, f := range s.Result.Flags {
		if i > 0 {
			names += ", "
		}
		names += f.Name
	}
	if names != "" {
		text(s.b, left, 54, "flag", "", names)
	}
}

// axes are the line at the bottom with its times, and a few values at the left.
func (s *scene) axes() {
	y := top + trace + 50
	line(s.b, "hair", left, y, width-right, y)
	unit, name := si.Second, "time"
	step := nice((s.t1 - s.t0) / 6)
	for t := math.Ceil(s.t0/step) * step; t <= s.t1+step/1e6; t += step {
		label := si.Format(t, unit)
		if s.Untimed {
			label, name = fmt.Sprintf("%.0f", t), "sample"
		}
		if math.Abs(t) < step/1e6 {
			label = "0"
		}
		line(s.b, "hair", s.x(t), y, s.x(t), y+5)
		text(s.b, s.x(t), y+20, "soft", "middle", label)
	}
	text(s.b, width-right+12, y+20, "soft", "", name)
	v := nice((s.high - s.low) / 4)
	for k := math.Ceil(s.low / v); k*v <= s.high; k++ {
		line(s.b, "hair", left-5, s.y(k*v), left, s.y(k*v))
		text(s.b, left-9, s.y(k*v)+4, "soft", "end", tick(k*v, v))
	}
}

// tick is an axis figure with as many decimals as its step needs.
func tick(x, step float64) string {
	return fmt.Sprintf("%.*f", max(0, int(-math.Floor(math.Log10(step)+1e-9))), x+0)
}

// nice is the step of 1, 2 or 5 times a power of ten next above x.
func nice(x float64) float64 {
	p := math.Pow(10, math.Floor(math.Log10(x)))
	for _, m := range []float64{1, 2, 5} {
		if m*p >= x {
			return m * p
		}
	}
	return 10 * p
}

func line(b *bytes.Buffer, class string, x0, y0, x1, y1 float64) {
	fmt.Fprintf(b, `<path class="%s" d="M%.1f %.1fL%.1f %.1f"/>`+"\n", class, x0, y0, x1, y1)
}

func text(b *bytes.Buffer, x, y float64, class, anchor, words string) {
	if anchor != "" {
		anchor = fmt.Sprintf(` text-anchor="%s"`, anchor)
	}
	fmt.Fprintf(b, `<text class="%s" x="%.1f" y="%.1f"%s>%s</text>`+"\n", class, x, y, anchor, esc(words))
}

func esc(s string) string { return html.EscapeString(s) }
