package drivertest

import (
	"fmt"
	"math"
	"time"
)

// MakerScope is a scope of some maker's on a function of time. Every maker's
// screen, codes and preamble are worked out here from its own manual.
type MakerScope struct {
	Maker
	Signal func(channel int, t float64) float64 // V at the tip
	Dead   bool                                 // no trigger ever comes

	Scale, Offset, Probe map[int]float64 // by channel, as the maker counts them
	PerDivision          float64         // s
	Source               int             // of the record that is read
	Duty                 float64         // what its own measurements find; NaN: nothing to measure

	auto, running, opc bool
	turn               int // of acquisitions, so that an old one's end is not a new one's
	wide               float64
}

func newMakerScope(wide float64) *MakerScope {
	s := &MakerScope{Maker: Maker{End: "\n"}, wide: wide, PerDivision: 1e-3, Source: 1, Duty: 0.3,
		Scale: map[int]float64{}, Offset: map[int]float64{}, Probe: map[int]float64{}}
	for n := range 4 {
		s.Scale[n+1], s.Probe[n+1] = 1, 1
	}
	return s
}

// run starts an acquisition, which ends when its record is full, or, without a trigger, never.
func (s *MakerScope) run() {
	s.turn++
	s.running = true
	if !s.Dead || s.auto {
		s.trigger()
	}
}

func (s *MakerScope) trigger() {
	turn := s.turn
	s.later(time.Duration(s.wide*s.PerDivision*float64(time.Second)), func() string {
		if turn != s.turn || !s.running {
			return ""
		}
		return s.end()
	})
}

// end ends an acquisition and gives the *OPC? that was held back.
func (s *MakerScope) end() string {
	s.running = false
	if s.opc {
		s.opc = false
		return "1"
	}
	return ""
}

// holdOPC is *OPC? of a scope that holds it back until the record is there.
func (s *MakerScope) holdOPC() {
	s.on(`\*OPC\?`, func([]string) string {
		if !s.running {
			return "1"
		}
		s.opc = true
		return ""
	})
}

// codes samples a channel: code gives the code of a voltage.
func (s *MakerScope) codes(channel, points int, code func(v float64) float64, low, high float64) []byte {
	data := make([]byte, points)
	interval := s.wide * s.PerDivision / float64(points)
	for i := range data {
		t := -s.wide/2*s.PerDivision + float64(i)*interval
		data[i] = byte(int(math.Min(math.Max(math.Round(code(s.Signal(channel, t))), low), high)))
	}
	return data
}

// block is data behind # and the count, in as many digits as the maker sends.
func block(digits int, data []byte) string {
	return fmt.Sprintf("#%d%0*d%s", digits, digits, len(data), data)
}

// decimal is a number that may have an exponent, as a rule takes it.
const decimal = `([-+]?[0-9.]+(?:[Ee][-+]?[0-9]+)?)`

// InfiniiVision is the scope of the 2000X programmer's guide: yorigin in volts
// about reference 128, codes 0, 1 and 255 are flags, blocks with eight digits.
func InfiniiVision() *MakerScope {
	s := newMakerScope(10)
	q := &queue{none: `+0,"No error"`}
	s.unknown = func(m string) { q.push(`-113,"Undefined header"`) }
	points := 1000
	s.says(`\*IDN\?`, "AGILENT TECHNOLOGIES,DSO-X 2024A,MY12345678,02.41.2015102200")
	s.takes(`\*CLS|\*RST|:CHAN[12]:DISP ON|:WAV:POIN:MODE NORM|:TRIG:EDGE:LEV .*`)
	s.says(`\*OPC\?`, "1")
	s.on(`:SYST:ERR\?`, q.next)
	s.takes(`:WAV:UNS ON|:WAV:FORM BYTE|:TRIG:EDGE:SLOP POS|:CHAN[12]:COUP DC|:TRIG:EDGE:SOUR CHAN[12]`)
	s.says(`:WAV:UNS\?`, "1")
	s.says(`:WAV:FORM\?`, "BYTE")
	s.says(`:TRIG:EDGE:SLOP\?`, "POS")
	s.says(`:TRIG:EDGE:SOUR\?`, "CHAN1")
	s.says(`:TRIG:EDGE:LEV\?`, "+4.50000E+00")
	s.says(`:CHAN[12]:COUP\?`, "DC")
	s.vertical(`:CHAN([12]):`, "SCAL", "OFFS", "PROB")
	s.on(`:TIM:SCAL `+decimal, func(p []string) string { s.PerDivision = number(p[1]); return "" })
	s.on(`:TIM:SCAL\?`, func([]string) string { return long(s.PerDivision) })
	s.on(`:WAV:POIN (\d+)`, func(p []string) string { points = int(number(p[1])); return "" })
	s.on(`:WAV:POIN\?`, func([]string) string { return fmt.Sprintf("%+d", points) })
	s.on(`:TRIG:SWE (NORM|AUTO)`, func(p []string) string { s.auto = p[1] == "AUTO"; return "" })
	s.on(`:TRIG:SWE\?`, func([]string) string { return word("AUTO", "NORM", s.auto) })
	s.on(`:SING`, func([]string) string { s.run(); return "" })
	s.on(`:STOP`, func([]string) string { return s.end() })
	s.on(`:OPER:COND\?`, func([]string) string { return word("+8", "+0", s.running) }) // bit 3: run
	s.on(`:WAV:SOUR CHAN([12])`, func(p []string) string { s.Source = int(number(p[1])); return "" })
	s.on(`:WAV:SOUR\?`, func([]string) string { return fmt.Sprint("CHAN", s.Source) })
	step := func() float64 { return s.Scale[s.Source] / 32 }
	s.on(`:WAV:PRE\?`, func([]string) string {
		return fmt.Sprintf("+0,+0,%+d,+1,%+.8E,%+.8E,+0,%+.8E,%+.8E,+128", points, 10*s.PerDivision/float64(points), -5*s.PerDivision, step(), s.Offset[s.Source])
	})
	s.on(`:WAV:DATA\?`, func([]string) string {
		return block(8, s.codes(s.Source, points, func(v float64) float64 { return (v-s.Offset[s.Source])/step() + 128 }, 1, 255))
	})
	s.on(`:MEAS:(DUTY|FREQ|PER|VAV)\? CHAN[12]`, func(p []string) string {
		if math.IsNaN(s.Duty) {
			return "+9.9E+37"
		}
		return long(map[string]float64{"DUTY": 100 * s.Duty, "FREQ": 125, "PER": 8e-3, "VAV": 4.5}[p[1]]) // duty in percent
	})
	return s
}

// vertical are scale, offset and probe of a channel under a header.
func (s *MakerScope) vertical(header, scale, offset, probe string) {
	for name, of := range map[string]map[int]float64{scale: s.Scale, offset: s.Offset, probe: s.Probe} {
		s.on(header+name+" "+decimal, func(p []string) string { of[int(number(p[1]))] = number(p[2]); return "" })
		s.on(header+name+`\?`, func(p []string) string { return fmt.Sprintf("%+.5E", of[int(number(p[1]))]) })
	}
}

// DS1054Z is the scope of the DS1000Z programming guide: the preamble's yorigin
// counts in codes, the offset is added to the signal, *OPC? is answered 0 while
// busy, and a record is read between two sample numbers.
func DS1054Z() *MakerScope {
	s := newMakerScope(12)
	q := &queue{none: `0,"No error"`}
	s.unknown = func(m string) { q.push(`-113,"Undefined header; keyword cannot be found"`) }
	first, last := 1, 1200
	s.says(`\*IDN\?`, "RIGOL TECHNOLOGIES,DS1054Z,DS1ZA123456789,00.04.04.SP3")
	s.takes(`\*CLS|\*RST|:CHAN[12]:DISP ON|:TRIG:EDGE:LEV .*`)
	s.on(`\*OPC\?`, func([]string) string { return word("0", "1", s.running) })
	s.on(`:SYST:ERR\?`, q.next)
	s.takes(`:WAV:MODE NORM|:WAV:FORM BYTE|:TRIG:EDGE:SLOP POS|:CHAN[12]:COUP DC|:TRIG:EDGE:SOUR CHAN[12]`)
	s.says(`:WAV:MODE\?`, "NORM")
	s.says(`:WAV:FORM\?`, "BYTE")
	s.says(`:TRIG:EDGE:SLOP\?`, "POS")
	s.says(`:TRIG:EDGE:SOUR\?`, "CHAN1")
	s.says(`:TRIG:EDGE:LEV\?`, "4.500000e+00")
	s.says(`:CHAN[12]:COUP\?`, "DC")
	s.vertical(`:CHAN([12]):`, "SCAL", "OFFS", "PROB")
	s.on(`:TIM:MAIN:SCAL `+decimal, func(p []string) string { s.PerDivision = number(p[1]); return "" })
	s.on(`:TIM:MAIN:SCAL\?`, func([]string) string { return fmt.Sprintf("%.7e", s.PerDivision) })
	s.on(`:TRIG:SWE (NORM|AUTO)`, func(p []string) string { s.auto = p[1] == "AUTO"; return "" })
	s.on(`:TRIG:SWE\?`, func([]string) string { return word("AUTO", "NORM", s.auto) })
	s.on(`:SING`, func([]string) string { s.run(); return "" })
	s.on(`:STOP`, func([]string) string { return s.end() })
	s.on(`:TRIG:STAT\?`, func([]string) string { return word("WAIT", "STOP", s.running) })
	s.on(`:WAV:SOUR CHAN([12])`, func(p []string) string { s.Source = int(number(p[1])); return "" })
	s.on(`:WAV:SOUR\?`, func([]string) string { return fmt.Sprint("CHAN", s.Source) })
	s.on(`:WAV:(STAR|STOP) (\d+)`, func(p []string) string {
		*map[string]*int{"STAR": &first, "STOP": &last}[p[1]] = int(number(p[2]))
		return ""
	})
	s.on(`:WAV:(STAR|STOP)\?`, func(p []string) string { return fmt.Sprint(map[string]int{"STAR": first, "STOP": last}[p[1]]) })
	step := func() float64 { return s.Scale[s.Source] / 25 }
	origin := func() float64 { return math.Round(s.Offset[s.Source] / step()) }
	s.on(`:WAV:PRE\?`, func([]string) string {
		return fmt.Sprintf("0,0,1200,1,%.6e,%.6e,0,%.6e,%.0f,127", s.PerDivision/100, -6*s.PerDivision, step(), origin())
	})
	s.on(`:WAV:DATA\?`, func([]string) string {
		data := s.codes(s.Source, 1200, func(v float64) float64 { return v/step() + origin() + 127 }, 0, 255)
		return block(9, data[first-1:last])
	})
	s.on(`:MEAS:ITEM\? (PDUT|FREQ|PER|VAVG),CHAN[12]`, func(p []string) string {
		if math.IsNaN(s.Duty) {
			return "9.9e37"
		}
		return fmt.Sprintf("%.6e", map[string]float64{"PDUT": s.Duty, "FREQ": 125, "PER": 8e-3, "VAVG": 4.5}[p[1]]) // duty as a ratio
	})
	return s
}
