package drivertest

import (
	"math"
	"strconv"
	"sync"

	"nightbench/instruments/scpi"
)

// Supply is a supply of 32 V and 3 A with a resistor across it.
type Supply struct {
	Listener
	Load    float64 // Ω; 0 means 100
	Stuck   bool    // it says that its output is off and leaves it on
	Refuses bool    // it ignores every OUTP
	Short   float64 // V at the terminals from elsewhere

	mu      sync.Mutex // guards what follows
	volts   float64
	amperes float64
	over    float64
	on      bool
	tripped bool
}

// NewSupply makes a supply that has just been switched on.
func NewSupply() *Supply {
	s := &Supply{Load: 100, over: 34, amperes: 3}
	d := scpi.NewDevice("Nightbench,practice-supply,T1,1.0", 20)
	d.Status.TakeEvents()
	s.Device = d
	d.Set("OUTPut[:STATe]", s.locked(func(c *scpi.Call) error { return s.output(c.Bool(0)) }), scpi.Boolean{})
	d.Get("OUTPut[:STATe]", s.asked(func() string { return scpi.Bit(s.on) }))
	s.value("[SOURce:]VOLTage[:LEVel][:IMMediate][:AMPLitude]", &s.volts, 1e-3, 32)
	s.value("[SOURce:]CURRent[:LEVel][:IMMediate][:AMPLitude]", &s.amperes, 1e-3, 3)
	s.value("[SOURce:]VOLTage:PROTection[:LEVel]", &s.over, 1e-2, 34)
	d.Get("[SOURce:]VOLTage:PROTection:TRIPped", s.asked(func() string { return scpi.Bit(s.tripped) }))
	d.Set("[SOURce:]VOLTage:PROTection:CLEar", s.locked(func(*scpi.Call) error { s.tripped = false; return nil }))
	d.Get("MEASure[:SCALar]:VOLTage[:DC]", s.asked(func() string { v, _ := s.terminals(); return scpi.NR3(v) }))
	d.Get("MEASure[:SCALar]:CURRent[:DC]", s.asked(func() string { _, i := s.terminals(); return scpi.NR3(i) }))
	return s
}

func (s *Supply) locked(do func(*scpi.Call) error) func(*scpi.Call) error {
	return func(c *scpi.Call) error {
		s.mu.Lock()
		defer s.mu.Unlock()
		err := do(c)
		s.Device.Status.Questionable.SetCondition(s.regulation())
		return err
	}
}

func (s *Supply) asked(say func() string) func(*scpi.Call) (string, error) {
	return func(*scpi.Call) (string, error) {
		s.mu.Lock()
		defer s.mu.Unlock()
		return say(), nil
	}
}

func (s *Supply) value(header string, v *float64, step, most float64) {
	s.Device.Set(header, s.locked(func(c *scpi.Call) error {
		*v = math.Round(c.Number(0)/step) * step
		return nil
	}), scpi.Numeric{Max: most})
	s.Device.Get(header, s.asked(func() string { return strconv.FormatFloat(*v, 'f', 4, 64) }))
}

func (s *Supply) output(on bool) error {
	switch {
	case s.Refuses:
	case on && s.tripped:
		return scpi.NewFault(scpi.SettingsConflict, "protection tripped")
	default:
		s.on = on
	}
	return nil
}

// terminals is what is at the output.
func (s *Supply) terminals() (v, i float64) {
	if !s.on && !s.Stuck {
		return s.Short, 0
	}
	v = min(s.volts, s.amperes*s.Load)
	return v, v / s.Load
}

// regulation is the questionable condition: bit 0 in constant current, bit 1 in constant voltage.
func (s *Supply) regulation() uint16 {
	switch {
	case !s.on:
		return 0
	case s.volts > s.amperes*s.Load:
		return 1
	}
	return 2
}

// On tells whether the output feeds.
func (s *Supply) On() bool {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.on
}

// Leave puts the supply in the state that somebody left it in.
func (s *Supply) Leave(volts float64, on bool) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.volts, s.on = volts, on
}

// Trip is what an over-voltage does.
func (s *Supply) Trip() {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.on, s.tripped = false, true
}
