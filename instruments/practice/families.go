package practice

import (
	"bytes"
	"fmt"
	"strings"

	"nightbench/instruments/scpi"
)

// registerMultiplier is the family with a labelled preamble, scaled by YMULT, YOFF and YZERO.
func (s *scope) registerMultiplier() {
	source := 1
	s.Set("DATa:SOUrce", func(c *scpi.Call) error { source = numberOf(c.Word(0)); return nil }, scpi.Choice{Words: []string{"CH1", "CH2", "CH3", "CH4"}})
	s.Get("DATa:SOUrce", func(*scpi.Call) (string, error) { return fmt.Sprintf("CH%d", source), nil })
	s.Get("WFMPre", func(*scpi.Call) (string, error) {
		r, err := s.record()
		if err != nil {
			return "", err
		}
		perCode, zero := s.scale8(&r.inputs[source-1])
		return strings.Join([]string{"1", "8", "BIN", "RI", "MSB", fmt.Sprint(r.points), scpi.FormatString(fmt.Sprintf("Ch%d, DC coupling", source)), "Y",
			scpi.NR3(r.interval), "0", scpi.NR3(r.origin), `"s"`, scpi.NR3(perCode), scpi.NR3(zero), "0", `"Volts"`}, ";"), nil
	})
	for name, value := range map[string]func(r *acquisition) float64{
		"XINcr":  func(r *acquisition) float64 { return r.interval },
		"XZEro":  func(r *acquisition) float64 { return r.origin },
		"PT_Off": func(*acquisition) float64 { return 0 },
		"YMUlt":  func(r *acquisition) float64 { k, _ := s.scale8(&r.inputs[source-1]); return k },
		"YOFf":   func(*acquisition) float64 { return 0 },
		"YZEro":  func(r *acquisition) float64 { _, z := s.scale8(&r.inputs[source-1]); return z },
	} {
		s.Get("WFMPre:"+name, func(*scpi.Call) (string, error) {
			r, err := s.record()
			if err != nil {
				return "", err
			}
			return scpi.NR3(value(r)), nil
		})
	}
	s.Get("CURVe", func(*scpi.Call) (string, error) {
		data, err := s.bytesOf(source, 0)
		return scpi.FormatBlock(data), err
	})
}

// registerDivision is the family whose codes are 25 a division: replies carry header,
// prefix and unit, and two NL follow a block.
func (s *scope) registerDivision() {
	const divisions = codesAScreen / 25
	in := func(r *acquisition, c *scpi.Call) *input { return &r.inputs[c.Suffix[0]-1] }
	told := func(name string, value func(in *input) float64) {
		s.Get("C<1-4>:"+name, func(c *scpi.Call) (string, error) {
			r, err := s.record()
			if err != nil {
				return "", err
			}
			return fmt.Sprintf("C%d:%s %.2EV", c.Suffix[0], name, value(in(r, c))), nil
		})
	}
	told("VDIV", func(in *input) float64 { return (in.high - in.low) / divisions })
	told("OFST", func(in *input) float64 { return -(in.high + in.low) / 2 })
	s.Get("TDIV", func(*scpi.Call) (string, error) {
		r, err := s.record()
		if err != nil {
			return "", err
		}
		return fmt.Sprintf("TDIV %.2ES", r.interval*float64(r.points)/14), nil
	})
	s.Get("SARA", func(*scpi.Call) (string, error) {
		r, err := s.record()
		if err != nil {
			return "", err
		}
		return fmt.Sprintf("SARA %.3ESa/s", 1/r.interval), nil
	})
	s.Get("C<1-4>:WF", func(c *scpi.Call) (string, error) {
		data, err := s.bytesOf(c.Suffix[0], 0)
		return fmt.Sprintf("C%d:WF DAT2,", c.Suffix[0]) + block(data, 9) + "\n", err
	}, scpi.Choice{Words: []string{"DAT2"}})
}

// registerLinear is the family of unsigned bytes with the screen's centre at 127.5.
func (s *scope) registerLinear() {
	get := func(name string, value func(r *acquisition, in *input) float64) {
		s.Get("CHANnel<1-4>:DATA:"+name, func(c *scpi.Call) (string, error) {
			r, err := s.record()
			if err != nil {
				return "", err
			}
			return scpi.NR3(value(r, &r.inputs[c.Suffix[0]-1])), nil
		})
	}
	get("XINCrement", func(r *acquisition, _ *input) float64 { return r.interval })
	get("XORigin", func(r *acquisition, _ *input) float64 { return r.origin })
	get("YINCrement", func(_ *acquisition, in *input) float64 { k, _ := s.scale8(in); return k })
	get("YORigin", func(_ *acquisition, in *input) float64 { k, z := s.scale8(in); return z - 127.5*k })
	s.Get("CHANnel<1-4>:DATA:HEADer", func(c *scpi.Call) (string, error) {
		r, err := s.record()
		if err != nil {
			return "", err
		}
		return fmt.Sprintf("%s,%s,%d,1", scpi.NR3(r.origin), scpi.NR3(r.origin+r.interval*float64(r.points)), r.points), nil
	})
	s.Get("CHANnel<1-4>:DATA", func(c *scpi.Call) (string, error) {
		data, err := s.bytesOf(c.Suffix[0], 127) // half a code lower than 127.5: within the converter's step
		return scpi.FormatBlock(data), err
	})
}

// tail puts the scope's own end behind a block.
func (s *scope) tail(reply []byte) []byte {
	end := tailBytes[s.kind.Tail]
	if end == "\n" || !bytes.HasPrefix(reply, []byte("#")) {
		return reply
	}
	return append(reply[:len(reply)-1], end...)
}
