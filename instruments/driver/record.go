package driver

import (
	"context"
	"encoding/binary"
	"fmt"
	"math"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
)

// fetch reads one channel of the last record, with the scaling it was made with.
func (s *Scope) fetch(ctx context.Context, c instruments.ScopeChannel) (instruments.Waveform, error) {
	p := dialect.Put{Channel: c.Number}
	scale, err := s.scaling(ctx, p)
	if err != nil {
		return instruments.Waveform{}, err
	}
	l, err := s.line("record")
	if err != nil {
		return instruments.Waveform{}, err
	}
	query := p.Fill(l.Ask)
	size := map[string]int{"int8": 1, "int16": 2}[s.d.Waveform.Samples]
	block, err := s.conn.QueryBlock(ctx, query, s.d.Waveform.MostPoints*size)
	if err != nil {
		return instruments.Waveform{}, s.fault(query, err)
	}
	points := int(scale["points"])
	if len(block) != points*size || points != s.set.Points {
		return instruments.Waveform{}, &Error{Instrument: s.name, Command: query, Err: ErrReply,
			Found: fmt.Sprintf("%d bytes for %d points, %d were asked for", len(block), points, s.set.Points),
			Try:   "the record is not used; take a new one"}
	}
	return s.waveform(c, scale, samples(block, s.d.Waveform)), nil
}

// scaling asks how the codes of the last record are to be read.
func (s *Scope) scaling(ctx context.Context, p dialect.Put) (map[string]float64, error) {
	l, err := s.line("scaling")
	if err != nil {
		return nil, err
	}
	scale := map[string]float64{}
	err = s.ask(ctx, l, p, func(reply string) error {
		parts := scpi.SplitList(reply)
		if len(parts) != len(l.Fields) {
			return fmt.Errorf("%w: %q holds %d fields instead of %d", scpi.ErrForm, reply, len(parts), len(l.Fields))
		}
		for n, name := range l.Fields {
			v, err := scpi.ParseNumber(parts[n])
			if err != nil {
				return err
			}
			if v.Outcome != scpi.Measured {
				return fmt.Errorf("%w: %s is %q", scpi.ErrForm, name, parts[n])
			}
			scale[name] = v.Value
		}
		return nil
	})
	if err != nil {
		return nil, err
	}
	if !(scale["xincrement"] > 0) || scale["yincrement"] == 0 || scale["points"] != math.Trunc(scale["points"]) || scale["points"] < 2 {
		return nil, &Error{Instrument: s.name, Command: p.Fill(l.Ask), Err: ErrReply, Found: fmt.Sprint(scale), Try: "take a new record"}
	}
	return scale, nil
}

// samples turns the bytes of a block into codes.
func samples(block []byte, w *dialect.Waveform) []int16 {
	if w.Samples == "int8" {
		codes := make([]int16, len(block))
		for i, b := range block {
			codes[i] = int16(int8(b))
		}
		return codes
	}
	var order binary.ByteOrder = binary.BigEndian
	if w.ByteOrder == "little" {
		order = binary.LittleEndian
	}
	codes := make([]int16, len(block)/2)
	for i := range codes {
		codes[i] = int16(order.Uint16(block[2*i:]))
	}
	return codes
}

// waveform puts a record together (family code-linear).
func (s *Scope) waveform(c instruments.ScopeChannel, scale map[string]float64, codes []int16) instruments.Waveform {
	figure, _ := s.d.Figure("voltage", 0)
	accuracy := figure.Accuracy
	accuracy.Resolution = max(accuracy.Resolution, math.Abs(scale["yincrement"]))
	return instruments.Waveform{
		Channel: c.Number, Codes: codes,
		Start: scale["xorigin"], Interval: scale["xincrement"],
		VoltsPerCode: scale["yincrement"], VoltsAtZero: scale["yorigin"],
		ClipLow: s.d.Waveform.ClipLow, ClipHigh: s.d.Waveform.ClipHigh,
		Accuracy: accuracy, FullScale: c.High - c.Low, TimeBase: s.d.Waveform.TimeBase,
	}
}
