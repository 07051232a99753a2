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

// vertical are scale, offset and probe of a channel under a header.
func (s *MakerScope) vertical(header, scale, offset, probe string) {
	for name, of := range map[string]map[int]float64{scale: s.Scale, offset: s.Offset, probe: s.Probe} {
		s.on(header+name+" "+decimal, func(p []string) string { of[int(number(p[1]))] = number(p[2]); return "" })
		s.on(header+name+`\?`, func(p []string) string { return fmt.Sprintf("%+.5E", of[int(number(p[1]))]) })
	}
}
