package driver

import (
	"math"
	"slices"
	"testing"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
)

func TestDecode(t *testing.T) {
	for name, c := range map[string]struct {
		w     dialect.Waveform
		block []byte
		want  []float64
	}{
		"BigEndian":    {dialect.Waveform{Samples: "int16", ByteOrder: "big"}, []byte{0xff, 0x80, 0x00, 0x7f, 0x0a, 0x0a}, []float64{-128, 127, 2570}},
		"LittleEndian": {dialect.Waveform{Samples: "int16", ByteOrder: "little"}, []byte{0x80, 0xff, 0x7f, 0x00}, []float64{-128, 127}},
		"Signed":       {dialect.Waveform{Samples: "int8"}, []byte{0xfc, 0x7f}, []float64{-4, 127}}, // two's complement: 0xFC is -4
		// Siglent SDS1104X-E Programming Guide p. 142 prints "subtract 255": 0xFC is -3
		"Less255":  {dialect.Waveform{Samples: "int8", Negative: "255"}, []byte{0xfc, 0x7f}, []float64{-3, 127}},
		"Unsigned": {dialect.Waveform{Samples: "uint8"}, []byte{0, 142, 255}, []float64{0, 142, 255}},
		"Words":    {dialect.Waveform{Samples: "uint16", ByteOrder: "big"}, []byte{0xff, 0xff, 0, 1}, []float64{65535, 1}},
		// IEEE 754: 0x3FC00000 is 1.5
		"Real": {dialect.Waveform{Samples: "real32", ByteOrder: "big"}, []byte{0x3f, 0xc0, 0, 0}, []float64{1.5}},
		"Text": {dialect.Waveform{Samples: "text"}, []byte("1.5E+00, -2.5E-01,3,"), []float64{1.5, -0.25, 3}},
	} {
		if got, err := decode(c.block, &c.w); err != nil || !slices.Equal(got, c.want) {
			t.Errorf("%s: got %v, %v, want %v", name, got, err, c.want)
		}
	}
}

func TestDecodeRefuses(t *testing.T) {
	for name, c := range map[string]struct {
		w     dialect.Waveform
		block []byte
	}{
		"HalfASample":  {dialect.Waveform{Samples: "int16"}, []byte{1, 2, 3}},
		"NotANumber":   {dialect.Waveform{Samples: "real32"}, []byte{0x7f, 0xc0, 0, 0}},
		"TextOverload": {dialect.Waveform{Samples: "text"}, []byte("1,9.9E37")},
		"Garbage":      {dialect.Waveform{Samples: "text"}, []byte("1,2,x")},
	} {
		if got, err := decode(c.block, &c.w); err == nil {
			t.Errorf("%s: got %v", name, got)
		}
	}
}

// The scaling formulas as the makers' programming guides print them, with
// worked figures.
func TestScales(t *testing.T) {
	for _, c := range []struct {
		name     string
		w        dialect.Waveform
		fields   map[string]float64
		code, at float64
		i, when  float64
	}{
		// InfiniiVision guides (2000X p. 644): (raw - yreference)·yincrement + yorigin, (i - xreference)·xincrement + xorigin
		{"VoltsOrigin", dialect.Waveform{Family: "volts-origin"},
			map[string]float64{"xincrement": 1e-6, "xorigin": -5e-4, "xreference": 0, "yincrement": 0.02, "yorigin": 0.5, "yreference": 128}, 178, 1.5, 100, -4e-4},
		// Rigol DS1000Z 2-140: fields …,0.008000,50,127; 0x8E gives (142 - 50 - 127)·0.008
		{"CountsOrigin", dialect.Waveform{Family: "counts-origin"},
			map[string]float64{"xincrement": 1e-6, "xorigin": -3e-3, "yincrement": 0.008, "yorigin": 50, "yreference": 127}, 142, -0.28, 1000, -2e-3},
		// Tektronix TDS programmer manual 2-178: (raw - YOFF)·YMULT + YZERO, XZERO + XINCR·(i - PT_OFF)
		{"Multiplier", dialect.Waveform{Family: "multiplier"},
			map[string]float64{"xincr": 4e-6, "xzero": 0, "pt_off": 1250, "ymult": 0.04, "yoff": -50, "yzero": 1}, 25, 4, 1250, 0},
		// Siglent SDS1104X-E p. 142: code·(vdiv/25) - voffset; first point = trdl - timebase·grid/2
		{"PerDivision", dialect.Waveform{Family: "per-division", CodesPerDivision: 25, Grid: 14},
			map[string]float64{"volts_per_division": 0.5, "offset": -0.05, "seconds_per_division": 5e-6, "delay": 0, "sample_rate": 1e9}, 75, 1.55, 0, -35e-6},
		// R&S RTB2000 p. 342: yorigin + yincrement·raw; the middle of the screen is raw 127.5
		{"Linear", dialect.Waveform{Family: "code-linear"},
			map[string]float64{"xincrement": 1e-8, "xorigin": -6e-6, "yincrement": 8. / 255, "yorigin": -4}, 127.5, 0, 600, 0},
	} {
		k := scaleOf(&c.w, c.fields)
		if got := c.code*k.perCode + k.atZero; math.Abs(got-c.at) > 1e-12 {
			t.Errorf("%s: code %g is %g V, want %g V", c.name, c.code, got, c.at)
		}
		if got := k.start + c.i*k.interval; math.Abs(got-c.when) > 1e-12 {
			t.Errorf("%s: sample %g is at %g s, want %g s", c.name, c.i, got, c.when)
		}
	}
}

func TestVoltsBecomeCodes(t *testing.T) {
	var w instruments.Waveform
	volts := []float64{0, 1.5, -0.25, 8.2, -2}
	quantise(&w, volts, instruments.ScopeChannel{Low: -2, High: 8}, 256)
	for i, v := range volts {
		got := float64(w.Codes[i])*w.VoltsPerCode + w.VoltsAtZero
		if clipped := w.Codes[i] <= w.ClipLow || w.Codes[i] >= w.ClipHigh; clipped != (v >= 8 || v <= -2) {
			t.Errorf("%g V counts as clipped: %v", v, clipped)
		} else if !clipped && math.Abs(got-v) > w.VoltsPerCode/2 {
			t.Errorf("%g V became %g V", v, got)
		}
	}
	if got, want := w.Accuracy.Resolution, 10./256; got != want {
		t.Errorf("resolution %g V, want the converter's %g V", got, want)
	}
}
