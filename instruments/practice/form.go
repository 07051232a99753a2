package practice

import (
	"encoding/binary"
	"fmt"
	"strconv"
	"strings"

	"nightbench/instruments/scpi"
)

// Form is the way a scope tells its records: the standard dialect's, or one of the
// scaling families that makers have.
type Form string

// The forms. The formulas are the makers': Keysight InfiniiVision, Rigol DS1000Z,
// Tektronix TDS2000, Siglent SDS1000X-E and R&S RTB2000 programming manuals.
const (
	Standard     Form = "standard"      // volts = code × yincrement + yorigin
	VoltsOrigin  Form = "volts-origin"  // (raw − yreference) × yincrement + yorigin, yorigin in volts
	CountsOrigin Form = "counts-origin" // (raw − yorigin − yreference) × yincrement, yorigin in counts
	Multiplier   Form = "multiplier"    // (raw − YOFF) × YMULT + YZERO, instant = XZERO + XINCR (i − PT_OFF)
	Division     Form = "division"      // code × (volts a division / 25) − offset, codes signed
	Linear       Form = "linear"        // yorigin + yincrement × raw, raw unsigned, the screen's centre at 127.5
)

// Forms are all of them.
func Forms() []Form {
	return []Form{Standard, VoltsOrigin, CountsOrigin, Multiplier, Division, Linear}
}

// registerForm registers the headers of the scope's form; the standard's own are always there.
func (s *scope) registerForm() {
	channel := scpi.Choice{Words: []string{"CH1", "CH2", "CH3", "CH4"}}
	s.Get("TRACe[:DATA]", func(c *scpi.Call) (string, error) { return s.words(numberOf(c.Word(0))) }, channel)
	s.Get("TRACe:PREamble", func(c *scpi.Call) (string, error) {
		r, err := s.record()
		if err != nil {
			return "", err
		}
		perCode, zero := s.scale(&r.inputs[numberOf(c.Word(0))-1])
		return numbers(float64(r.points), r.interval, r.origin, perCode, zero), nil
	}, channel)
	switch s.kind.Form {
	case VoltsOrigin, CountsOrigin:
		s.registerTenFields()
	case Multiplier:
		s.registerMultiplier()
	case Division:
		s.registerDivision()
	case Linear:
		s.registerLinear()
	}
}

// channelWords are the names of the channels in short and long form.
var channelWords = []string{"CHAN1", "CHAN2", "CHAN3", "CHAN4", "CHANNEL1", "CHANNEL2", "CHANNEL3", "CHANNEL4"}

func numberOf(word string) int { return int(word[len(word)-1] - '0') }

// numbers joins a list in the standard's form: the count as it is, the rest NR3.
func numbers(count float64, rest ...float64) string {
	out := []string{strconv.Itoa(int(count))}
	for _, v := range rest {
		out = append(out, scpi.NR3(v))
	}
	return strings.Join(out, ",")
}

// words is a record as 16-bit words, big-endian.
func (s *scope) words(n int) (string, error) {
	_, codes, err := s.codesOf(n)
	if err != nil {
		return "", err
	}
	data := make([]byte, 0, 2*len(codes))
	for _, k := range codes {
		data = binary.BigEndian.AppendUint16(data, uint16(k))
	}
	return scpi.FormatBlock(data), nil
}

// bytesOf is a record as bytes, code 0 at centre; a finer converter is cut to 8 bits.
func (s *scope) bytesOf(n, centre int) ([]byte, error) {
	_, codes, err := s.codesOf(n)
	if err != nil {
		return nil, err
	}
	data := make([]byte, len(codes))
	for i, k := range codes {
		v := int(k)>>(s.kind.Bits-8) + centre
		if centre > 0 {
			v = min(max(v, 0), 255)
		}
		data[i] = byte(v)
	}
	return data, nil
}

// scale8 is scale for records cut to 8 bits.
func (s *scope) scale8(in *input) (perCode, zero float64) {
	perCode, zero = s.scale(in)
	return perCode * float64(int(1)<<(s.kind.Bits-8)), zero
}

// registerTenFields is the family with a preamble of ten fields in the same order and two
// meanings of yorigin. The block head has 8 digits with one maker, 9 with the other.
func (s *scope) registerTenFields() {
	source := 1
	s.Set("WAVeform:SOURce", func(c *scpi.Call) error { source = numberOf(c.Word(0)); return nil }, scpi.Choice{Words: channelWords})
	s.Get("WAVeform:SOURce", func(*scpi.Call) (string, error) { return fmt.Sprintf("CHAN%d", source), nil })
	s.Get("WAVeform:PREamble", func(*scpi.Call) (string, error) {
		r, err := s.record()
		if err != nil {
			return "", err
		}
		perCode, zero := s.scale8(&r.inputs[source-1])
		head := fmt.Sprintf("0,0,%d,1,%s,%s,0,%s,", r.points, scpi.NR3(r.interval), scpi.NR3(r.origin), scpi.NR3(perCode))
		if s.kind.Form == VoltsOrigin {
			return head + scpi.NR3(zero) + ",128", nil
		}
		counts := -quantise(zero/perCode, 1)
		return head + strconv.Itoa(int(counts)) + ",127", nil
	})
	digits, centre := 8, 128
	if s.kind.Form == CountsOrigin {
		digits, centre = 9, 127
	}
	s.Get("WAVeform:DATA", func(*scpi.Call) (string, error) {
		data, err := s.bytesOf(source, centre)
		return block(data, digits), err
	})
}

// block is a definite-length block with a fixed count of digits.
func block(data []byte, digits int) string {
	return fmt.Sprintf("#%d%0*d", digits, digits, len(data)) + string(data)
}
