// Package predict computes what a board's schematic gives at a setpoint: timing,
// levels, currents, speed, from the circuit laws; with the 95 % band that the
// parts' tolerances leave (Monte Carlo, JCGM 101), the sensitivities to each
// part, and how hard each part is stressed.
//
// One mechanism serves all timing networks: the conducting diode's junction
// voltage is the variable, everything is explicit in it, and a phase's length is
// C·∫ dv/i by quadrature. SI units throughout; temperatures in °C.
package predict

import (
	"fmt"
	"math"
	"slices"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/internal/numeric"
)

// Reference is the temperature, °C, at which part figures hold.
const Reference = 27.0

// Options are what a prediction needs besides the board. The zero value will do
// for a board whose pot is exact.
type Options struct {
	Catalogue        *Catalogue          // already read; nil: built-in and the board's own parts
	PotTolerance     float64             // relative half-width of the bench's pot; 0 where its ohms were measured
	WiperResistance  float64             // Ω, network wiper
	Track            si.TolResistance    // end to end, network wiper with the bench's pot
	Average          instruments.Between // nodes between which average_voltage is metered; zero: the load's terminals
	PotMaxCurrent    float64             // A through the wiper; 0: unknown
	PotMaxVoltage    float64             // V at any pot terminal; 0: unknown
	quadraturePoints int                 // 0: as usual; tests double it
}

// quadraturePoints is enough for 1e-9 within an interval whose current changes sixfold.
const quadraturePoints = 10

// Model is a board ready to be computed. It is immutable, and safe for use by several goroutines.
type Model struct {
	board     sweeps.Board
	o         Options
	nominal   parts
	variables []variable
	drop, low levels
	quiescent [][3]float64
	rds       [][2]float64
	rule      numeric.Rule
	rated     struct {
		timer                      TimerPart
		charge, discharge, flyback DiodePart
		transistor                 TransistorPart
		load                       struct{ current, power float64 } // A continuous, W of heat; 0: not known
	}
}

// New resolves the board's parts in the catalogue and checks that the board can
// work at all. The error names nodes and numbers.
func New(board sweeps.Board, o Options) (*Model, error) {
	c := o.Catalogue
	if c == nil {
		var err error
		if c, err = ReadCatalogue(board.Parts); err != nil {
			return nil, err
		}
	}
	n := o.quadraturePoints
	if n == 0 {
		n = quadraturePoints
	}
	if o.Average == (instruments.Between{}) {
		o.Average = loadTerminals
	}
	if err := checkAverage(o.Average); err != nil {
		return nil, fmt.Errorf("board %q: %w", board.Name, err)
	}
	m := &Model{board: board, o: o, rule: numeric.GaussLegendre(n)}
	if err := m.resolve(c); err != nil {
		return nil, fmt.Errorf("board %q: %w", board.Name, err)
	}
	if err := m.check(); err != nil {
		return nil, err
	}
	return m, nil
}

// Board is the board as read.
func (m *Model) Board() sweeps.Board { return m.board }

// Setting is where a board is to be computed.
type Setting struct {
	Supply      float64 `json:"supply_voltage"` // V
	Pot         float64 `json:"pot"`            // Ω between the pot's two used terminals; network wiper: share of the track in the charging path
	Temperature float64 `json:"temperature"`    // °C; Reference where nobody measured
	Burden      float64 `json:"burden"`         // Ω in series in the motor's loop, a meter's
	Output      Output  `json:"timer_output,omitempty"`
}

// Output says what the timer's output does: it oscillates, or a person or a wire
// holds it, which is how a static drop is measured.
type Output string

// The outputs.
const (
	Oscillating Output = ""
	HeldHigh    Output = "high"
	HeldLow     Output = "low"
)

// check refuses a setting no board can be in.
func (m *Model) checkSetting(s Setting) error {
	t := &m.board.Timing
	switch {
	case s.Output != Oscillating && s.Output != HeldHigh && s.Output != HeldLow:
		return fmt.Errorf("timer output %q: hold it %q or %q, or leave it to oscillate", s.Output, HeldHigh, HeldLow)
	case !(s.Supply > 0) || math.IsInf(s.Supply, 1):
		return fmt.Errorf("supply of %g V: give a voltage above 0 V", s.Supply)
	case !(s.Burden >= 0) || math.IsInf(s.Burden, 1):
		return fmt.Errorf("burden of %g ohm: give 0 ohm or more", s.Burden)
	case !(s.Temperature > -100 && s.Temperature < 200):
		return fmt.Errorf("temperature of %g degC: give one between -100 and 200 degC; %g where nobody measured", s.Temperature, Reference)
	case t.Network == sweeps.Wiper && !(s.Pot >= 0 && s.Pot <= 1):
		return fmt.Errorf("pot position %g: the share of the track in the charging path lies between 0 and 1", s.Pot)
	case t.Network != sweeps.Wiper && t.UsesPot() && !(s.Pot >= 0 && !math.IsInf(s.Pot, 1)):
		return fmt.Errorf("pot resistance %g ohm: give 0 ohm or more", s.Pot)
	}
	return nil
}

// conditions is a setting as the laws use it.
type conditions struct {
	supply, pot, kelvin, burden float64
	held                        Output
}

func (s Setting) conditions() conditions {
	return conditions{s.Supply, s.Pot, s.Temperature + 273.15, s.Burden, s.Output}
}

// Result is what a board does at a setting. A quantity that has no value there is
// absent from Values; a board that does not oscillate has only what it rests at, one
// whose output is held no times.
type Result struct {
	Values     map[sweeps.Quantity]float64 `json:"values"`
	Flags      []sweeps.Flag               `json:"flags"`
	Oscillates bool                        `json:"oscillates"`
}

// At computes the board of nominal parts. The error is of a setting that cannot be; "does not oscillate" is a result.
func (m *Model) At(s Setting) (Result, error) {
	if err := m.checkSetting(s); err != nil {
		return Result{}, fmt.Errorf("board %q: %w", m.board.Name, err)
	}
	o := m.solve(&m.nominal, s.conditions())
	return Result{Values: o.values(), Flags: m.flags(&o, s), Oscillates: o.stop == oscillates && s.Output == Oscillating}, nil
}

func keys(m map[string]float64) []string {
	var k []string
	for name := range m {
		k = append(k, name)
	}
	slices.Sort(k)
	return k
}
