package app

import (
	"fmt"
	"math/rand/v2"
	"strings"

	"nightbench/instruments"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"

	"gonum.org/v1/gonum/interp"
)

// specimen is one physical board of a design: the true value of every part, drawn within its tolerance from a seed.
type specimen struct {
	board sweeps.Board
	parts *predict.Catalogue
	value map[string]float64 // by the part's name in the model
	pot   instruments.PotWiring
	track float64 // −1 … 1: where in its tolerance the bench's pot lies

	seed   uint64
	fitted map[string]string // a diode's place: the catalogue part that stands there instead
}

// newSpecimen draws a specimen for a bench's pot; nil: the bench has none. A seed of 0
// draws none: every part at its nominal value.
func newSpecimen(board sweeps.Board, pot *instruments.PotWiring, seed uint64) (*specimen, error) {
	parts, err := predict.ReadCatalogue(board.Parts)
	if err != nil {
		return nil, err
	}
	o := predict.Options{Catalogue: parts}
	if pot != nil {
		o.Track = si.Exactly(si.Ohms(pot.EndToEnd)) // its true value is drawn below
	}
	m, err := predict.New(board, o)
	if err != nil {
		return nil, err
	}
	s := &specimen{board: board, parts: parts, value: map[string]float64{}, seed: seed, fitted: map[string]string{}}
	r := rand.New(rand.NewPCG(seed, 555))
	if seed != 0 {
		s.track = 0.8 * (2*r.Float64() - 1)
	}
	for _, p := range m.Parts() {
		s.value[p.Name] = p.Nominal
		if x := r.Float64(); seed != 0 {
			s.value[p.Name] = drawn(p, x)
		}
	}
	if pot != nil {
		s.pot = *pot
	}
	if board.Timing.Track.Pot {
		s.value["pot"] = s.potTrack()
	}
	return s, nil
}

// drawn takes a part to a share x of its tolerance, the nominal value in the middle:
// where the limits lie unevenly, each side is stretched to its own.
func drawn(p predict.Part, x float64) float64 {
	x = 0.5 + (x-0.5)*0.8 // a specimen at the very limit of everything teaches nothing
	if x < 0.5 {
		return p.Low + (p.Nominal-p.Low)*2*x
	}
	return p.Nominal + (p.High-p.Nominal)*(2*x-1)
}

// circuit is the specimen as the time-domain simulation takes it.
func (s *specimen) circuit(burden float64) (circuit.Board, error) {
	timer, err := s.timer()
	if err != nil {
		return circuit.Board{}, err
	}
	b := circuit.Board{
		Source: circuit.Source{Resistance: 0.05, Bulk: 470e-6, Bleed: 2200}, // leads and output capacitor of a small bench supply
		Timer:  timer, Timing: s.timing(), Load: s.load(burden),
	}
	if b.Driver, err = s.driver(); err != nil {
		return b, err
	}
	b.Flyback = s.diode("flyback", s.board.Driver.Flyback)
	s.enliven(&b.Load)
	return b, nil
}

func (s *specimen) timer() (circuit.Timer, error) {
	var part predict.TimerPart
	for _, t := range s.parts.Timers {
		if strings.EqualFold(t.Name, s.board.Timer.Part) {
			part = t
		}
	}
	v := s.value
	t := circuit.Timer{
		Threshold: v["threshold"], Trigger: v["trigger_ratio"], TriggerCurrent: v["trigger_current"], ThresholdCurrent: v["threshold_current"],
		Delay: v["delay"], DischargeOffset: v["discharge_offset"], DischargeResistance: v["discharge_resistance"],
		PushPull: part.PushPull, DropPerKelvin: part.DropPerKelvin, MinSupply: 3, Rise: v["edge"], Fall: v["edge"],
		Clamp: circuit.Diode{Is: 1e-12, N: 1, Rs: 1}, // the chip's substrate diode: common practice, no source
	}
	for _, l := range part.Drop {
		t.Drop = append(t.Drop, curve(l.Supply, l.Rows, v["drop_scale"]))
	}
	for _, l := range part.Low {
		t.Low = append(t.Low, curve(l.Supply, l.Rows, v["low_scale"]))
	}
	if own := s.board.Timer.Drop; len(own) > 0 {
		t.Drop = circuit.Levels{ownCurve(own)}
	}
	if own := s.board.Timer.Low; len(own) > 0 {
		t.Low = circuit.Levels{ownCurve(own)}
	}
	for _, q := range part.Quiescent {
		t.Quiescent = append(t.Quiescent, circuit.Quiescent{Volts: q[0], Amps: (q[1] + q[2]) / 2 * v["quiescent_scale"]})
	}
	if q := s.board.Timer.Quiescent; q != nil {
		t.Quiescent = []circuit.Quiescent{{Volts: 9, Amps: q.SI()}}
	}
	if s.board.Timing.Control != nil {
		return t, fmt.Errorf("the practice bench can't feed pin 5 yet: leave timing.control out")
	}
	return t, nil
}

// curve is an output table as a real output behaves: smooth and monotone between the
// published rows. The simulation joins points by straight lines, so that it gets many.
func curve(supply float64, rows [][2]float64, scale float64) circuit.Curve {
	c := circuit.Curve{Supply: supply}
	if len(rows) < 3 {
		for _, r := range rows {
			c.Points = append(c.Points, circuit.Point{Amps: r[0], Volts: r[1] * scale})
		}
		return c
	}
	x, y := make([]float64, len(rows)), make([]float64, len(rows))
	for i, r := range rows {
		x[i], y[i] = r[0], r[1]*scale
	}
	var smooth interp.FritschButland
	if err := smooth.Fit(x, y); err != nil {
		panic(err) // the catalogue's tables rise: its reader checks it
	}
	for i := 1; i < len(x); i++ {
		for k := range 10 {
			a := x[i-1] + (x[i]-x[i-1])*float64(k)/10
			c.Points = append(c.Points, circuit.Point{Amps: a, Volts: smooth.Predict(a)})
		}
	}
	last := len(x) - 1
	c.Points = append(c.Points, circuit.Point{Amps: x[last], Volts: y[last]})
	return c
}

func ownCurve(rows []sweeps.CurrentVoltage) circuit.Curve {
	var pairs [][2]float64
	for _, r := range rows {
		pairs = append(pairs, [2]float64{r.Current.SI(), r.Voltage.SI()})
	}
	return curve(9, pairs, 1)
}

// networks maps the board file's words to the simulation's.
var networks = map[sweeps.Network]circuit.NetworkKind{
	sweeps.Plain: circuit.Plain, sweeps.Bypassed: circuit.Bypassed, sweeps.Steered: circuit.Steered, sweeps.Wiper: circuit.Wiper, sweeps.OutputFed: circuit.OutputFed,
}

// timing places the resistors: the simulation's common resistor is R_A (output-fed: the common one), Down is R_B, Up the charging branch.
func (s *specimen) timing() circuit.Timing {
	t, v := s.board.Timing, s.value
	c := circuit.Timing{Network: networks[t.Network], Capacitance: v["capacitor"], ChargeDiode: s.diode("charge_diode", t.ChargeDiode), DischargeDiode: s.diode("discharge_diode", t.DischargeDiode)}
	c.Common, c.Down = v["charge"], v["discharge"]
	place := func(r sweeps.Resistor, at circuit.PotPlace, fixed *float64) {
		if r.Pot {
			c.Pot = at
			*fixed += v["stop"]
		}
	}
	if t.Network == sweeps.OutputFed {
		c.Common, c.Up = v["common"], v["charge"]
		place(t.Common, circuit.PotCommon, &c.Common)
		place(t.Charge, circuit.PotUp, &c.Up)
	} else {
		place(t.Charge, circuit.PotCommon, &c.Common)
	}
	place(t.Discharge, circuit.PotDown, &c.Down)
	if t.Network == sweeps.Wiper {
		c.Pot, c.PotTrack, c.Up, c.Down = circuit.PotWiper, v["pot"], v["stop_up"], v["stop_down"]
		if t.Track.Pot {
			c.PotWiperOhms = s.pot.Wiper
		}
	}
	return c
}

func (s *specimen) diode(name string, d sweeps.Diode) *circuit.Diode {
	if d.None || d.Name == "" && d.Is == 0 {
		return nil
	}
	out := &circuit.Diode{Is: s.value[name+".is"], N: s.value[name+".n"], Rs: s.value[name+".rs"], Rsh: s.value[name+".shunt"]}
	part := d.Name
	if f := s.fitted[name]; f != "" {
		part = f
	}
	for _, p := range s.parts.Diodes {
		if strings.EqualFold(p.Name, part) {
			out.Eg, out.Xti = p.Eg, p.Xti
		}
	}
	return out
}

var stages = map[sweeps.Stage]circuit.Stage{
	sweeps.StageNone: circuit.StageNone, sweeps.StageNPN: circuit.NPN, sweeps.StageDarlington: circuit.Darlington, sweeps.StageNMOS: circuit.NMOS,
}

func (s *specimen) driver() (circuit.Driver, error) {
	d, v := s.board.Driver, s.value
	out := circuit.Driver{Stage: stages[d.Stage]}
	if d.Stage == sweeps.StageNone {
		return out, nil
	}
	part := predict.TransistorPart{Rds: [][2]float64{{4.5, d.Part.RdsOn}}, HFEMin: d.Part.HFEMin}
	for _, p := range s.parts.Transistors {
		if strings.EqualFold(p.Name, d.Part.Name) {
			part = p
		}
	}
	out.Storage, out.Breakdown, out.Edge = part.StorageTime, part.Breakdown, 50e-9
	if out.Breakdown == 0 {
		out.Breakdown = 30
	}
	if d.Stage == sweeps.StageNMOS {
		if len(part.Rds) == 0 {
			return out, fmt.Errorf("driver.part %q has no on-resistance", d.Part.Name)
		}
		rated := part.Rds[0]
		out.RatedGate, out.Resistance, out.GateLevel = rated[0], rated[1]*v["rds_scale"], v["vgs_th"]
		out.Body = &circuit.Diode{Is: 1e-11, N: 1.1, Rs: 0.03}
		return out, nil
	}
	out.Saturation, out.Resistance, out.Vbe, out.Gain, out.BaseResistor = v["vce_sat"], v["saturation_resistance"], v["vbe"], part.HFEMin, v["base_resistor"]
	return out, nil
}

func (s *specimen) load(burden float64) circuit.Load {
	l, v := s.board.Load, s.value
	out := circuit.Load{Kind: circuit.Resistor, ToSupply: l.ToSupply, Resistance: v["load.resistance"], Burden: burden}
	if l.Kind != sweeps.Motor {
		return out
	}
	out.Kind = circuit.Motor
	out.Inductance, out.Constant = v["load.inductance"], v["load.torque_constant"]
	out.StaticTorque, out.CoulombTorque, out.ViscousTorque, out.QuadraticTorque = v["load.static_torque"], v["load.coulomb_torque"], v["load.viscous_torque"], v["load.quadratic_torque"]
	out.BrushDrop, out.Inertia = v["load.brush_drop"], v["load.inertia"]
	out.StaticTorque = max(out.StaticTorque, out.CoulombTorque)
	return out
}

// potTrack is the true end-to-end resistance of the bench's pot, Ω.
func (s *specimen) potTrack() float64 {
	return s.pot.EndToEnd * (1 + s.track*s.pot.Tolerance)
}
