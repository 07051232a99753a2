package driver

import (
	"encoding/binary"
	"fmt"
	"math"
	"strings"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
)

// decode turns the bytes of a record into codes, or into volts where the
// samples are numbers.
func decode(data []byte, w *dialect.Waveform) ([]float64, error) {
	if w.Samples == "text" {
		return decodeText(string(data))
	}
	size := w.Size()
	if len(data)%size != 0 {
		return nil, fmt.Errorf("%w: %d bytes are no whole count of %d-byte samples", ErrReply, len(data), size)
	}
	var order binary.ByteOrder = binary.BigEndian
	if w.ByteOrder == "little" {
		order = binary.LittleEndian
	}
	values := make([]float64, len(data)/size)
	for i := range values {
		switch b := data[i*size:]; w.Samples {
		case "int8":
			values[i] = float64(int8(b[0]))
			if b[0] > 127 && w.Negative == "255" {
				values[i] = float64(int(b[0]) - 255)
			}
		case "uint8":
			values[i] = float64(b[0])
		case "int16":
			values[i] = float64(int16(order.Uint16(b)))
		case "uint16":
			values[i] = float64(order.Uint16(b))
		case "real32":
			values[i] = float64(math.Float32frombits(order.Uint32(b)))
		}
		if !(math.Abs(values[i]) < 1e30) {
			return nil, fmt.Errorf("%w: sample %d is %g", ErrReply, i+1, values[i])
		}
	}
	return values, nil
}

func decodeText(text string) ([]float64, error) {
	parts := strings.Split(strings.TrimRight(strings.TrimSpace(text), ","), ",")
	values := make([]float64, len(parts))
	for i, part := range parts {
		n, err := scpi.ParseNumber(part)
		if err == nil && n.Outcome != scpi.Measured {
			err = fmt.Errorf("%w: sample %d is %q", ErrReply, i+1, part)
		}
		if err != nil {
			return nil, err
		}
		values[i] = n.Value
	}
	return values, nil
}

// scale is how codes and sample numbers become volts and seconds:
// volts = code·perCode + atZero, instant = start + i·interval.
type scale struct{ start, interval, perCode, atZero float64 }

// scaleOf applies the family's formula; see families in instruments/dialect.
func scaleOf(w *dialect.Waveform, f map[string]float64) scale {
	switch w.Family {
	case "volts-origin":
		return scale{f["xorigin"] - f["xreference"]*f["xincrement"], f["xincrement"],
			f["yincrement"], f["yorigin"] - f["yreference"]*f["yincrement"]}
	case "counts-origin":
		return scale{f["xorigin"] - f["xreference"]*f["xincrement"], f["xincrement"],
			f["yincrement"], -(f["yorigin"] + f["yreference"]) * f["yincrement"]}
	case "multiplier":
		return scale{f["xzero"] - f["pt_off"]*f["xincr"], f["xincr"], f["ymult"], f["yzero"] - f["yoff"]*f["ymult"]}
	case "per-division":
		interval := f["sample_interval"]
		if interval == 0 {
			interval = 1 / f["sample_rate"]
		}
		return scale{f["delay"] - f["seconds_per_division"]*w.Grid/2, interval, f["volts_per_division"] / w.CodesPerDivision, -f["offset"]}
	}
	return scale{f["xorigin"], f["xincrement"], f["yincrement"], f["yorigin"]}
}

// waveform puts a record together.
func (s *Scope) waveform(c instruments.ScopeChannel, fields map[string]float64, values []float64) (instruments.Waveform, error) {
	w := s.d.Waveform
	k := scaleOf(w, fields)
	if w.Family == "volts" {
		k.perCode = 1
	}
	if !(k.interval > 0) || math.IsInf(k.interval, 0) || k.perCode == 0 || math.IsNaN(k.perCode) {
		return instruments.Waveform{}, &Error{Instrument: s.name, Command: "scaling of its record", Err: ErrReply, Found: fmt.Sprint(fields), Try: "take a new record"}
	}
	figure, _ := s.d.Figure("voltage", 0, c.Number)
	out := instruments.Waveform{
		Channel: c.Number, Start: k.start, Interval: k.interval,
		Accuracy: figure.At((c.High + c.Low) / 2), FullScale: c.High - c.Low, TimeBase: w.TimeBase,
	}
	if w.Family == "volts" {
		quantise(&out, values, c, w.Levels)
		return out, nil
	}
	shift := 0 // into the range of an int16
	if w.Samples == "uint16" {
		shift = 1 << 15
	}
	out.VoltsPerCode, out.VoltsAtZero = k.perCode, k.atZero+float64(shift)*k.perCode
	out.ClipLow, out.ClipHigh = clipCode(w.ClipLow-shift), clipCode(w.ClipHigh-shift)
	out.Codes = make([]int16, len(values))
	for i, v := range values {
		out.Codes[i] = int16(int(v) - shift)
	}
	out.Accuracy.Resolution = max(out.Accuracy.Resolution, math.Abs(k.perCode))
	return out, nil
}

func clipCode(code int) int16 { return int16(min(max(code, math.MinInt16), math.MaxInt16)) }

// quantise makes codes of volts: 60000 over the screen, which is finer than any
// converter of 14 bits. What reaches an end of the screen counts as clipped.
func quantise(out *instruments.Waveform, volts []float64, c instruments.ScopeChannel, levels int) {
	const half = 30000
	out.VoltsPerCode, out.VoltsAtZero = (c.High-c.Low)/(2*half), (c.High+c.Low)/2
	out.ClipLow, out.ClipHigh = -half, half
	out.Codes = make([]int16, len(volts))
	for i, v := range volts {
		code := math.Round((v - out.VoltsAtZero) / out.VoltsPerCode)
		out.Codes[i] = int16(math.Min(math.Max(code, -half), half))
	}
	out.Accuracy.Resolution = max(out.Accuracy.Resolution, (c.High-c.Low)/float64(levels))
}
