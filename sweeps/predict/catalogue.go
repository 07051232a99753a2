package predict

import (
	"embed"
	"fmt"
	"io/fs"
	"slices"
	"strings"

	"nightbench/sweeps"
)

//go:embed catalogue/*.toml
var builtIn embed.FS

// Figure is one property of a catalogue part: SI units, limits where the maker
// states them, and where it comes from. Shape names the distribution a board's
// part is drawn from between the limits: triangular (default), rectangular, normal or log.
type Figure struct {
	Typical float64  `toml:"typical"`
	Low     *float64 `toml:"low"`
	High    *float64 `toml:"high"`
	Shape   string   `toml:"shape"`
	Source  string   `toml:"source"`
}

var shapes = map[string]shape{"": triangular, "triangular": triangular, "rectangular": rectangular, "normal": normal, "log": logarithmic}

// spread turns the figure into what is drawn from. A missing limit is the typical value.
func (f Figure) spread() spread {
	s := exactly(f.Typical)
	if f.Low != nil {
		s.low = *f.Low
	}
	if f.High != nil {
		s.high = *f.High
	}
	if s.low < s.high {
		s.shape = shapes[f.Shape]
	}
	return s
}

func (f Figure) check() error {
	s := f.spread()
	sh, known := shapes[f.Shape]
	switch {
	case !known:
		return fmt.Errorf("shape %q is not known; use triangular, rectangular, normal or log", f.Shape)
	case s.low > s.typical || s.typical > s.high:
		return fmt.Errorf("typical %g does not lie between low %g and high %g", s.typical, s.low, s.high)
	case sh == logarithmic && s.low <= 0:
		return fmt.Errorf("shape log needs a low above 0, found %g", s.low)
	}
	return nil
}

// level is an output table at one supply voltage: rows of current (A) and voltage (V).
type level struct {
	Supply float64      `toml:"supply"`
	Rows   [][2]float64 `toml:"rows"`
}

// TimerPart is a timer of the catalogue.
type TimerPart struct {
	Name                string       `toml:"name"`
	Words               string       `toml:"words"`
	PushPull            bool         `toml:"push_pull"` // MOS output: conducts both ways
	MaxSupply           Figure       `toml:"max_supply"`
	RecommendedSupply   Figure       `toml:"recommended_supply"` // from low to typical
	MaxOutputCurrent    Figure       `toml:"max_output_current"`
	MaxDischargeCurrent Figure       `toml:"max_discharge_current"`
	MaxPower            Figure       `toml:"max_power"`
	Threshold           Figure       `toml:"threshold"`     // fraction of the supply
	TriggerRatio        Figure       `toml:"trigger_ratio"` // trigger over threshold
	ControlResistance   Figure       `toml:"control_resistance"`
	TriggerCurrent      Figure       `toml:"trigger_current"`   // out of pin 2
	ThresholdCurrent    Figure       `toml:"threshold_current"` // into pin 6
	DischargeLeakage    Figure       `toml:"discharge_leakage"`
	DischargeOffset     Figure       `toml:"discharge_offset"`
	DischargeResistance Figure       `toml:"discharge_resistance"`
	Delay               Figure       `toml:"delay"`
	Edge                Figure       `toml:"edge"`
	DropScale           Figure       `toml:"drop_scale"`
	LowScale            Figure       `toml:"low_scale"`
	QuiescentScale      Figure       `toml:"quiescent_scale"`
	DropPerKelvin       float64      `toml:"drop_per_kelvin"` // V/K
	Quiescent           [][3]float64 `toml:"quiescent"`       // V, A with output low, A with output high
	Drop                []level      `toml:"drop"`
	Low                 []level      `toml:"low"`
}

// DiodePart is a diode of the catalogue.
type DiodePart struct {
	Name       string  `toml:"name"`
	Words      string  `toml:"words"`
	Is         Figure  `toml:"is"`
	N          Figure  `toml:"n"`
	Rs         Figure  `toml:"rs"`
	Shunt      Figure  `toml:"shunt"`       // Ω across the junction; 0: none
	Eg         float64 `toml:"eg"`          // eV
	Xti        float64 `toml:"xti"`         // exponent of temperature
	MaxCurrent Figure  `toml:"max_current"` // average
	MaxPower   Figure  `toml:"max_power"`
	MaxReverse Figure  `toml:"max_reverse"`
}

// TransistorPart is a transistor of the catalogue. Kind is npn, darlington or nmos.
type TransistorPart struct {
	Name                 string       `toml:"name"`
	Kind                 string       `toml:"kind"`
	Words                string       `toml:"words"`
	VBE                  Figure       `toml:"vbe"`
	BaseResistance       Figure       `toml:"base_resistance"`
	VCESat               Figure       `toml:"vce_sat"`
	SaturationResistance Figure       `toml:"saturation_resistance"`
	BetaF                Figure       `toml:"beta_f"`
	BetaR                Figure       `toml:"beta_r"`
	HFEMin               float64      `toml:"hfe_min"`
	StorageTime          float64      `toml:"storage_time"`
	VgsTh                Figure       `toml:"vgs_th"`
	RdsScale             Figure       `toml:"rds_scale"`
	Rds                  [][2]float64 `toml:"rds"` // gate voltage, Ω
	Breakdown            float64      `toml:"breakdown"`
	MaxCurrent           Figure       `toml:"max_current"`
	MaxPower             Figure       `toml:"max_power"`
}

// MotorPart is a small motor, for a board's load.part.
type MotorPart struct {
	Name            string  `toml:"name"`
	Words           string  `toml:"words"`
	RatedVoltage    float64 `toml:"rated_voltage"`
	Resistance      Figure  `toml:"resistance"`
	Inductance      Figure  `toml:"inductance"`
	TorqueConstant  Figure  `toml:"torque_constant"`
	StaticTorque    Figure  `toml:"static_torque"`
	CoulombTorque   Figure  `toml:"coulomb_torque"`
	ViscousTorque   Figure  `toml:"viscous_torque"`
	QuadraticTorque Figure  `toml:"quadratic_torque"`
	BrushDrop       Figure  `toml:"brush_drop"`
	Inertia         Figure  `toml:"inertia"`
	MaxCurrent      Figure  `toml:"max_current"` // continuous
	MaxPower        Figure  `toml:"max_power"`   // heat in the winding
}

// Catalogue is the parts known by name. A user's part replaces a built-in one of the same name.
type Catalogue struct {
	Timers      []TimerPart      `toml:"timer"`
	Diodes      []DiodePart      `toml:"diode"`
	Transistors []TransistorPart `toml:"transistor"`
	Motors      []MotorPart      `toml:"motor"`
}

// ReadCatalogue reads the built-in parts and, beside them, the user's own files. An
// error names file, line and key.
func ReadCatalogue(own []sweeps.File) (*Catalogue, error) {
	c := &Catalogue{}
	names, err := fs.Glob(builtIn, "catalogue/*.toml")
	if err != nil {
		return nil, fmt.Errorf("read parts: %w", err)
	}
	for _, name := range names {
		text, err := fs.ReadFile(builtIn, name)
		if err != nil {
			return nil, fmt.Errorf("read parts: %w", err)
		}
		more, err := parseParts(name, text)
		if err != nil {
			return nil, err
		}
		c.take(more)
	}
	var mine Catalogue
	for _, file := range own {
		more, err := parseParts(file.Name, []byte(file.Text))
		if err != nil {
			return nil, err
		}
		if err := mine.twice(file, more); err != nil {
			return nil, err
		}
		mine.take(more)
	}
	c.take(mine)
	return c, nil
}

func (c *Catalogue) take(more Catalogue) {
	c.Timers = replace(c.Timers, more.Timers, func(p TimerPart) string { return p.Name })
	c.Diodes = replace(c.Diodes, more.Diodes, func(p DiodePart) string { return p.Name })
	c.Transistors = replace(c.Transistors, more.Transistors, func(p TransistorPart) string { return p.Name })
	c.Motors = replace(c.Motors, more.Motors, func(p MotorPart) string { return p.Name })
}

func replace[P any](old, more []P, name func(P) string) []P {
	for _, p := range more {
		i := slices.IndexFunc(old, func(o P) bool { return strings.EqualFold(name(o), name(p)) })
		if i < 0 {
			old = append(old, p)
			continue
		}
		old[i] = p
	}
	return old
}

// find returns the part of that name; the error lists the names there are.
func find[P any](kind, name string, parts []P, nameOf func(P) string) (P, error) {
	var names []string
	for _, p := range parts {
		if strings.EqualFold(nameOf(p), name) {
			return p, nil
		}
		names = append(names, nameOf(p))
	}
	var none P
	return none, fmt.Errorf("no %s %q in the catalogue; there are %s", kind, name, strings.Join(names, ", "))
}
