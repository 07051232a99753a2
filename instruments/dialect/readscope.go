package dialect

import (
	"fmt"
	"slices"
	"strings"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

func (r *reader) screen(t *userfile.Table) {
	if !t.Present() {
		return
	}
	s := &Screen{}
	t.Number("divisions", &s.Divisions)
	t.Number("time_divisions", &s.TimeDivisions)
	if s.Divisions <= 0 || s.TimeDivisions <= 0 {
		t.Fail("divisions", "give how many divisions the screen has, high and wide")
	}
	s.Offset = "centre"
	userfile.Word(t.Optional(), "offset", &s.Offset, "centre", "shift", "divisions")
	r.source(t, &s.Source)
	r.d.Screen = s
}

func (r *reader) waveform(t *userfile.Table) {
	w, o := &Waveform{Head: "block", Tail: "any", Negative: "complement"}, t.Optional()
	userfile.Word(t, "family", &w.Family, "code-linear", "volts-origin", "counts-origin", "multiplier", "per-division", "volts")
	userfile.Word(t, "samples", &w.Samples, "int16", "uint16", "int8", "uint8", "real32", "text")
	order := o
	if w.Size() > 1 {
		order = t
	}
	userfile.Word(order, "byte_order", &w.ByteOrder, "big", "little")
	userfile.Word(o, "head", &w.Head, "block", "none")
	o.Strings("lead", &w.Lead)
	userfile.Word(o, "tail", &w.Tail, "any", "nl", "nl nl")
	r.codes(t, w)
	o.Int("points", &w.Points, 1, 1<<30)
	t.Int("most_points", &w.MostPoints, 1, 1<<30)
	o.Int("most_a_read", &w.MostARead, 1, 1<<30)
	o.Bool("needs_stop", &w.NeedsStop)
	var base, aging si.Ratio
	t.Text("time_base", &base)
	o.Text("time_base_a_year", &aging)
	w.TimeBase = base.SI() + aging.SI()
	if w.Head == "none" && w.Samples != "text" {
		t.Fail("head", "only text can come without a block's head: bytes have no other end")
	}
	r.source(t, &w.Source)
	r.d.Waveform = w
}

// codes reads what single codes mean.
func (r *reader) codes(t *userfile.Table, w *Waveform) {
	o := t.Optional()
	if w.Family == "volts" {
		t.Int("levels", &w.Levels, 2, 1<<16)
		if w.Samples != "real32" && w.Samples != "text" {
			t.Fail("samples", "of the family volts are real32 or text")
		}
		return
	}
	if w.Samples == "real32" || w.Samples == "text" {
		t.Fail("family", "samples that are numbers are volts; use the family volts")
	}
	t.Int("clip_low", &w.ClipLow, -32768, 65535)
	t.Int("clip_high", &w.ClipHigh, -32768, 65535)
	if w.ClipLow >= w.ClipHigh {
		t.Fail("clip_high", "has to be above clip_low")
	}
	if w.Family == "per-division" {
		t.Number("codes_per_division", &w.CodesPerDivision)
		t.Number("grid", &w.Grid)
		if w.CodesPerDivision <= 0 || w.Grid <= 0 {
			t.Fail("codes_per_division", "give how many codes a division has, and grid, how many divisions of time a record has")
		}
	}
	userfile.Word(o, "negative", &w.Negative, "complement", "255")
}

// scaling reads the lines whose replies are fields of the scaling.
func (r *reader) scaling(f *userfile.File) {
	t := f.Optional().Table("scaling")
	given := slices.Clone(r.d.Commands["scaling"].Fields)
	for _, name := range t.Keys() {
		l := r.line(t.Table(name), name, spec{does: "say its " + name, needs: asks, channel: true})
		r.d.Scaling[name] = l
		if l.Reply == ReplyNumbers {
			given = append(given, l.Fields...)
		} else {
			given = append(given, name)
		}
	}
	if r.d.Waveform.Family == "" {
		return
	}
	r.fields(f, given)
}

// fields holds the fields a family needs against those there are.
func (r *reader) fields(f *userfile.File, given []string) {
	w := r.d.Waveform
	fam := families[w.Family]
	var missing []string
	for _, need := range fam.needs {
		if !slices.Contains(given, need) {
			missing = append(missing, need)
		}
	}
	if len(missing) > 0 {
		f.Table("waveform").Fail("family", fmt.Sprintf("needs %s, which no line of [scaling] and no field of command.scaling gives; %s",
			strings.Join(missing, ", "), fam.formula))
	}
	if w.Family == "per-division" && !slices.Contains(given, "sample_rate") && !slices.Contains(given, "sample_interval") {
		f.Table("waveform").Fail("family", "needs sample_rate or sample_interval among [scaling]")
	}
	known := append(slices.Concat(fam.needs, fam.may), "points", "-")
	for _, name := range given {
		if !slices.Contains(known, name) {
			f.Table("waveform").Fail("family", fmt.Sprintf("has no field %q; use %s, and - for one that is not wanted", name, strings.Join(known[:len(known)-1], ", ")))
		}
	}
}

// wholeScope wants each job of a scope done in one way or the other.
func (r *reader) wholeScope(t *userfile.Table) {
	has := func(name string) bool { _, ok := r.d.Commands[name]; return ok }
	ends, scale := has("range_high") && has("range_low"), has("vertical_scale") && has("vertical_offset")
	if !ends && !scale {
		t.Fail("", "the screen can't be set: give range_high and range_low, or vertical_scale and vertical_offset with [screen]")
	}
	if !has("duration") && !has("time_scale") {
		t.Fail("", "the time can't be set: give duration, or time_scale with [screen]")
	}
	if r.d.Screen == nil && (has("vertical_scale") || has("time_scale")) {
		t.Fail("", "vertical_scale and time_scale count in divisions: give [screen]")
	}
	if !has("points") && r.d.Waveform.Points == 0 {
		t.Fail("", "the count of samples is not known: give points here, or points in [waveform] where it is fixed")
	}
	if has("part_first") != has("part_last") || has("part_first") != (r.d.Waveform.MostARead > 0) {
		t.Fail("", "part_first, part_last and most_a_read of [waveform] belong together")
	}
	if !has("trigger_none") && !has("force") {
		t.Fail("", "where no trigger comes it has to record all the same: give trigger_none, or force")
	}
	if r.d.Waveform.NeedsStop && !has("stop") {
		t.Fail("", "needs_stop of [waveform] needs the line stop")
	}
}
