package dialect

import (
	"fmt"
	"maps"
	"slices"
	"strings"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// figures reads the limits of error.
func (r *reader) figures(f *userfile.Table) {
	units := figures[r.d.Head.Role]
	for _, t := range f.Tables("accuracy") {
		var g Figure
		words := slices.Sorted(maps.Keys(units))
		if !userfile.Word(t, "of", &g.Of, words...) {
			continue
		}
		o, unit := t.Optional(), units[g.Of]
		r.limits(t, unit, &g)
		o.Int("channel", &g.Channel, 1, 99)
		r.quantity(o, "range", unit, &g.Range)
		r.quantity(o, "highest", unit, &g.Highest)
		if a := g.Accuracy; a.Reading <= 0 && a.Range <= 0 && a.Offset <= 0 {
			t.Fail("", "states no limit of error; give reading, of_range or offset")
		}
		if g.Highest > 0 && g.Highest < g.Range {
			t.Fail("highest", fmt.Sprintf("is below the range of %s", si.Format(g.Range, unit)))
		}
		r.source(t, &g.Source)
		o.String("note", &g.Note)
		r.d.Figures = append(r.d.Figures, g)
	}
	for of := range units {
		if !slices.ContainsFunc(r.d.Figures, func(g Figure) bool { return g.Of == of }) {
			f.Fail("", fmt.Sprintf("there is no [[accuracy]] of %s: without one a reading would have no uncertainty; use one of %s",
				of, strings.Join(slices.Sorted(maps.Keys(units)), ", ")))
		}
	}
}

// limits reads a limit of error in any of its forms.
func (r *reader) limits(t *userfile.Table, unit si.Unit, g *Figure) {
	o := t.Optional()
	var reading, ofRange si.Ratio
	o.Text("reading", &reading)
	o.Text("of_range", &ofRange)
	g.Accuracy = instruments.Accuracy{Reading: reading.SI(), Range: ofRange.SI()}
	r.quantity(o, "offset", unit, &g.Accuracy.Offset)
	r.quantity(o, "resolution", unit, &g.Accuracy.Resolution)
	var counts, divisions float64
	if o.Number("counts", &counts) {
		if g.Accuracy.Resolution <= 0 {
			t.Fail("counts", "needs resolution, which is one count")
		}
		g.Accuracy.Offset += counts * g.Accuracy.Resolution
	}
	if o.Number("divisions", &divisions) {
		if r.d.Screen == nil {
			t.Fail("divisions", "needs [screen], which says how many it has")
		} else {
			g.Accuracy.Range += divisions / r.d.Screen.Divisions
		}
	}
	var from string
	userfile.Word(o, "gain_from", &from, "zero", "offset")
	g.FromOffset = from == "offset"
}

// meter reads how long readings take and which speeds there are, slowest last.
func (r *reader) meter(f *userfile.File) {
	m, t := &Meter{}, f.Table("meter")
	t.Bool("auto_zero", &m.AutoZero)
	r.duration(t, "range_time", &m.RangeTime)
	userfile.Word(t, "speed_from", &m.SpeedFrom, "nplc", "aperture")
	r.source(t, &m.Source)
	r.d.Meter = m
	for _, t := range f.Tables("speed") {
		var s Speed
		var resolution, adds si.Ratio
		r.speedSetting(t, m.SpeedFrom, &s.Setting)
		t.Text("resolution", &resolution)
		t.Text("adds", &adds)
		s.Resolution, s.Adds = resolution.SI(), adds.SI()
		r.source(t, &s.Source)
		if n := len(r.d.Speeds); n > 0 && s.Setting <= r.d.Speeds[n-1].Setting {
			t.Fail("", "the speeds have to stand in order, the fastest (shortest aperture) first")
		}
		r.d.Speeds = append(r.d.Speeds, s)
	}
}

// speedSetting reads nplc as a number or aperture as a time.
func (r *reader) speedSetting(t *userfile.Table, from string, v *float64) {
	if from == "aperture" {
		r.quantity(t, "aperture", si.Second, v)
	} else {
		t.Number("nplc", v)
	}
	if *v <= 0 {
		t.Fail("", "give an aperture above 0")
	}
}
