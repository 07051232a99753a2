package drivertest

import (
	"fmt"
	"strconv"
)

// Output is one output of a maker's supply with a resistor across it.
type Output struct {
	Load                    float64 // Ω
	Volts, Limit            float64 // set
	Over, OverCurrent       float64 // protection levels; 0: none
	Armed, ArmedCurrent     bool
	On                      bool
	TrippedOver, TrippedAmp bool
	before                  bool // on before the trip
}

func newOutput() *Output { return &Output{Load: 100, Limit: 1} }

// look lets the protections act and gives what is at the terminals.
func (o *Output) look() (v, i float64) {
	v, i = o.terminals()
	switch {
	case o.Armed && o.Over > 0 && v > o.Over:
		o.TrippedOver = true
	case o.ArmedCurrent && o.OverCurrent > 0 && i > o.OverCurrent:
		o.TrippedAmp = true
	default:
		return v, i
	}
	o.before, o.On = o.On, false
	return 0, 0
}

func (o *Output) terminals() (v, i float64) {
	if !o.On {
		return 0, 0
	}
	v = min(o.Volts, o.Limit*o.Load)
	return v, v / o.Load
}

// limiting tells whether it is in constant current.
func (o *Output) limiting() bool { return o.On && o.Volts > o.Limit*o.Load }

// clear takes the latches away; some makers' supplies are as before the trip then.
func (o *Output) clear(again bool) {
	if (o.TrippedOver || o.TrippedAmp) && again {
		o.On = o.before
	}
	o.TrippedOver, o.TrippedAmp = false, false
}

// MakerSupply is a supply of some maker's.
type MakerSupply struct {
	Maker
	Out []*Output // the first is channel 1
}

// State is a copy of an output, channels from 1.
func (s *MakerSupply) State(channel int) (o Output) {
	s.Do(func() {
		s.Out[channel-1].look()
		o = *s.Out[channel-1]
	})
	return o
}

// at is the output that a digit names.
func (s *MakerSupply) at(digit string) *Output {
	n, err := strconv.Atoi(digit)
	if err != nil || n < 1 || n > len(s.Out) {
		return &Output{Load: 1}
	}
	return s.Out[n-1]
}

func number(text string) float64 {
	x, err := strconv.ParseFloat(text, 64)
	if err != nil {
		panic(err) // the rules let nothing else through
	}
	return x
}

// digits in the ways manuals print readings.
func fixed(places int, x float64) string { return strconv.FormatFloat(x, 'f', places, 64) }
func long(x float64) string              { return fmt.Sprintf("%+.8E", x) }

func word(yes, no string, is bool) string {
	if is {
		return yes
	}
	return no
}

func newMakerSupply(channels int, end string) *MakerSupply {
	s := &MakerSupply{Maker: Maker{End: end}}
	for range channels {
		s.Out = append(s.Out, newOutput())
	}
	return s
}

// num is a number as a rule takes it.
const num = `([-+]?[0-9.]+)`
