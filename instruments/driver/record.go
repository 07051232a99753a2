package driver

import (
	"context"
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// fetch reads one channel of the last record, with the scaling it was made with.
func (s *Scope) fetch(ctx context.Context, c instruments.ScopeChannel) (instruments.Waveform, error) {
	p := s.d.Put(0, c.Number)
	if err := s.ensureEach(ctx, p, "record_source"); err != nil {
		return instruments.Waveform{}, err
	}
	fields, err := s.scaling(ctx, p)
	if err != nil {
		return instruments.Waveform{}, err
	}
	l, err := s.line("record")
	if err != nil {
		return instruments.Waveform{}, err
	}
	values, err := s.samples(ctx, l, p)
	if err != nil {
		return instruments.Waveform{}, err
	}
	points, announced := fields["points"]
	if !announced {
		points = float64(s.set.Points)
	}
	if len(values) != int(points) || len(values) != s.set.Points {
		return instruments.Waveform{}, &Error{Instrument: s.name, Command: p.Fill(l.Ask), Err: ErrReply,
			Found: fmt.Sprintf("%d samples; %g are announced, %d were asked for", len(values), points, s.set.Points),
			Try:   "the record is not used; take a new one"}
	}
	return s.waveform(c, fields, values)
}

// scaling asks how the codes of the last record are to be read.
func (s *Scope) scaling(ctx context.Context, p dialect.Put) (map[string]float64, error) {
	fields := map[string]float64{}
	if s.has("scaling") {
		if err := s.fields(ctx, s.d.Commands["scaling"], p, fields); err != nil {
			return nil, err
		}
	}
	for _, name := range slices.Sorted(maps.Keys(s.d.Scaling)) {
		if err := s.fields(ctx, s.d.Scaling[name], p, fields); err != nil {
			return nil, err
		}
	}
	if n, ok := fields["points"]; ok && (n != math.Trunc(n) || n < 2) {
		return nil, &Error{Instrument: s.name, Command: "scaling of its record", Err: ErrReply, Found: fmt.Sprint(fields), Try: "take a new record"}
	}
	return fields, nil
}

// fields asks for one field, or for several in one reply.
func (s *Scope) fields(ctx context.Context, l dialect.Line, p dialect.Put, into map[string]float64) error {
	if l.Reply != dialect.ReplyNumbers {
		v, err := s.measured(ctx, l, p)
		into[l.Name] = v
		return err
	}
	return s.ask(ctx, l, p, func(answer string) error {
		parts := scpi.SplitList(answer)
		if l.Separator != "," {
			parts = strings.Split(answer, l.Separator)
		}
		if len(parts) != len(l.Fields) {
			return fmt.Errorf("%w: %q holds %d fields instead of %d", scpi.ErrForm, answer, len(parts), len(l.Fields))
		}
		for n, name := range l.Fields {
			if name == "-" {
				continue
			}
			v, err := parseNumber(dialect.Line{Scale: 1, Unit: l.Unit}, strings.TrimSpace(parts[n]))
			if err != nil {
				return err
			}
			if v.Outcome != scpi.Measured {
				return fmt.Errorf("%w: %s is %q", scpi.ErrForm, name, parts[n])
			}
			into[name] = v.Value
		}
		return nil
	})
}

// samples reads the samples of a record, in one part or several.
func (s *Scope) samples(ctx context.Context, l dialect.Line, p dialect.Put) ([]float64, error) {
	w := s.d.Waveform
	if w.MostARead == 0 {
		return s.part(ctx, l, p, w.MostPoints)
	}
	var all []float64
	for first := 1; first <= s.set.Points; first += w.MostARead {
		if err := s.choosePart(ctx, p, first, min(first+w.MostARead-1, s.set.Points)); err != nil {
			return nil, err
		}
		some, err := s.part(ctx, l, p, w.MostARead)
		if err != nil {
			return nil, err
		}
		all = append(all, some...)
	}
	return all, nil
}

// choosePart says which part comes next, so that the first is never behind the
// last on the way: back to the start the first goes ahead, on from there the last.
func (s *Scope) choosePart(ctx context.Context, p dialect.Put, first, last int) error {
	names, ends := []string{"part_last", "part_first"}, []int{last, first}
	if first == 1 {
		slices.Reverse(names)
		slices.Reverse(ends)
	}
	for n, name := range names {
		p.Value = float64(ends[n])
		if _, err := s.instrument.set(ctx, name, p, si.One); err != nil {
			return err
		}
	}
	return nil
}

// tails are what has to come after the bytes of a block.
var tails = map[string]string{"nl": "\n", "nl nl": "\n\n"}

// textSample is allowed for one sample as text: sign, nine digits, exponent, comma.
const textSample = 24

// part reads one part of a record, of at most so many samples.
func (s *Scope) part(ctx context.Context, l dialect.Line, p dialect.Put, most int) ([]float64, error) {
	w, query := s.d.Waveform, p.Fill(l.Ask)
	if w.Head == "none" {
		var values []float64
		err := s.ask(ctx, l, p, func(answer string) (err error) { values, err = decode([]byte(answer), w); return err })
		return values, err
	}
	if err := s.ready(ctx); err != nil {
		return nil, err
	}
	form := scpi.BlockForm{Tail: tails[w.Tail]}
	for _, lead := range w.Lead {
		form.Leads = append(form.Leads, p.Fill(lead))
	}
	size := w.Size()
	if size == 0 {
		size = textSample
	}
	block, err := s.conn.QueryBlockAs(ctx, query, form, most*size)
	if err != nil {
		return nil, s.fault(query, err)
	}
	values, err := decode(block, w)
	if err != nil {
		return nil, &Error{Instrument: s.name, Command: query, Err: err, Try: "the record is not used; take a new one"}
	}
	return values, nil
}
