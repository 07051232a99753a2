package sweeps

import (
	"encoding"
	"fmt"
	"slices"
	"strings"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// networkUse says which keys a network has a use for. Keys of fixed resistors
// may hold "pot"; of the optional ones a missing key is zero.
type networkUse struct {
	resistors []string // required
	optional  []string
	diodes    []string // required
}

var networks = map[Network]networkUse{
	Plain:     {resistors: []string{"charge", "discharge"}},
	Bypassed:  {resistors: []string{"charge", "discharge"}, diodes: []string{"charge_diode"}},
	Steered:   {resistors: []string{"charge", "discharge"}, diodes: []string{"charge_diode", "discharge_diode"}},
	Wiper:     {resistors: []string{"charge", "pot"}, optional: []string{"stop_up", "stop_down"}, diodes: []string{"charge_diode", "discharge_diode"}},
	OutputFed: {resistors: []string{"charge", "discharge"}, optional: []string{"common"}, diodes: []string{"charge_diode", "discharge_diode"}},
	// an output-fed network without diodes has one resistor only; timing() looks after that
}

var bareOutputFed = networkUse{resistors: []string{"common"}}

// timingKeys are all keys that depend on the network.
var timingKeys = []string{"charge", "discharge", "common", "pot", "stop_up", "stop_down", "charge_diode", "discharge_diode"}

// timing reads the timing network.
func timing(t *userfile.Table, v *Timing) {
	signed(t, "capacitor", &v.Capacitor, positive)
	control(t, v)
	if !userfile.Word(t, "network", &v.Network, Plain, Bypassed, Steered, Wiper, OutputFed) {
		t.Known(append(timingKeys, "stop")...)
		return
	}
	timingDiodes(t, v)
	use := networks[v.Network]
	if v.Network == OutputFed && v.ChargeDiode.None && v.DischargeDiode.None {
		use = bareOutputFed
	}
	refuseUseless(t, v.Network, use)
	timingResistors(t, v, use)
	stop(t, v)
}

func timingResistors(t *userfile.Table, v *Timing, use networkUse) {
	into := map[string]*Resistor{"charge": &v.Charge, "discharge": &v.Discharge, "common": &v.Common, "pot": &v.Track}
	var pots []string
	for _, key := range append(slices.Clone(use.resistors), use.optional...) {
		at := t
		if slices.Contains(use.optional, key) {
			at = t.Optional()
		}
		switch r := into[key]; {
		case r != nil && signed(at, key, r, resistorSign(r, use, key)) && r.Pot:
			pots = append(pots, key)
		case key == "stop_up":
			signed(at, key, &v.StopUp, notNegative)
		case key == "stop_down":
			signed(at, key, &v.StopDown, notNegative)
		}
	}
	if len(pots) > 1 {
		t.Fail(pots[1], fmt.Sprintf(`timing.%s is the bench's pot already; only one resistor may be "pot"`, pots[0]))
	}
}

// resistorSign lets a resistor that may be left out be zero. A pot has no value to judge.
func resistorSign(r *Resistor, use networkUse, key string) sign {
	if slices.Contains(use.optional, key) {
		return func(x float64) (bool, string) { return r.Pot || x >= 0, "a resistance can't be below zero" }
	}
	return func(x float64) (bool, string) { return r.Pot || x > 0, "a resistance has to be above zero" }
}

// timingDiodes reads the diodes. Where a network has no diode "none" may be said.
func timingDiodes(t *userfile.Table, v *Timing) {
	use := networks[v.Network].diodes
	bare := v.Network == OutputFed && !t.Has("charge_diode") && !t.Has("discharge_diode")
	into := map[string]*Diode{"charge_diode": &v.ChargeDiode, "discharge_diode": &v.DischargeDiode}
	for _, key := range []string{"charge_diode", "discharge_diode"} {
		d := into[key]
		d.None = true
		needed := slices.Contains(use, key)
		if (!needed || bare) && !t.Has(key) {
			t.Known(key)
			continue
		}
		if !diode(t, key, d) {
			d.None = false
			continue
		}
		switch {
		case !needed && !d.None:
			t.Fail(key, fmt.Sprintf(`network %q has no diode there; leave the line out or say "none"`, v.Network))
		case needed && d.None && v.Network == Steered && key == "discharge_diode":
			t.Fail(key, `network "steered" needs it; without it this is network = "bypassed"`)
		case needed && d.None && v.Network != OutputFed:
			t.Fail(key, fmt.Sprintf(`network %q needs it; give a diode like "1N4148"`, v.Network))
		}
	}
	if v.Network == OutputFed && v.ChargeDiode.None != v.DischargeDiode.None {
		t.Fail("discharge_diode", `network "output-fed" has both diodes, or "none" twice and one resistor, timing.common`)
	}
}

// refuseUseless reports the keys that a network has no use for.
func refuseUseless(t *userfile.Table, n Network, use networkUse) {
	useful := slices.Concat(use.resistors, use.optional)
	words := fmt.Sprintf("network %q has no use for it here; it uses %s", n, strings.Join(useful, ", "))
	if n == OutputFed && len(use.diodes) == 0 {
		words = `network "output-fed" without charge_diode and discharge_diode has one resistor, common`
	}
	for _, key := range timingKeys {
		if !slices.Contains(useful, key) && !strings.HasSuffix(key, "_diode") {
			t.Refuse(key, words)
		}
	}
}

// stop reads the fixed resistor in series with the pot.
func stop(t *userfile.Table, v *Timing) {
	switch {
	case v.Track.Pot || v.Network == Wiper && !v.UsesPot():
		t.Refuse("stop", `network "wiper" has stop_up and stop_down instead`)
	case !v.UsesPot():
		t.Refuse("stop", `it stands in series with the pot, and no resistor here is "pot"; add it to the resistor's value`)
	default:
		signed(t.Optional(), "stop", &v.Stop, notNegative)
	}
}

// control reads what is fed to pin 5.
func control(t *userfile.Table, v *Timing) {
	c := t.Optional().Table("control")
	if !c.Present() {
		return
	}
	v.Control = &Control{}
	signed(c, "voltage", &v.Control.Voltage, positive)
	signed(c.Optional(), "resistance", &v.Control.Resistance, notNegative)
}

// diode reads a catalogue name, "none", or { is, n, rs }.
func diode(t *userfile.Table, key string, d *Diode) bool {
	if !t.IsTable(key) {
		var name string
		if !t.String(key, &name) {
			return false
		}
		*d = Diode{None: name == "none", Name: name}
		if d.None {
			d.Name = ""
		}
		return true
	}
	in := t.Table(key)
	*d = Diode{}
	is := parameter[si.Current](in, "is", &d.Is, positive)
	n := parameter[si.Ratio](in, "n", &d.N, positive)
	parameter[si.Resistance](in.Optional(), "rs", &d.Rs, notNegative)
	return is && n
}

// parameter reads a part's figure: a bare number in SI, or a quantity with its unit.
func parameter[T any, P interface {
	*T
	number
}](t *userfile.Table, key string, v *float64, s sign) bool {
	var q T
	switch {
	case t.IsNumber(key):
		if !t.Number(key, v) {
			return false
		}
	case !t.Text(key, P(&q)):
		return false
	default:
		*v = P(&q).SI()
	}
	ok, want := s(*v)
	if !ok {
		t.Fail(key, want)
	}
	return ok
}

// UnmarshalText reads a resistance with its tolerance, or "pot".
func (r *Resistor) UnmarshalText(b []byte) error {
	if string(b) == "pot" {
		*r = Resistor{Pot: true}
		return nil
	}
	var v si.TolResistance
	if err := v.UnmarshalText(b); err != nil {
		return fmt.Errorf(`%w, or "pot" for the bench's pot`, err)
	}
	*r = Resistor{Value: v}
	return nil
}

// SI is the nominal resistance, Ω; 0 for a pot.
func (r Resistor) SI() float64 { return r.Value.SI() }

var _ encoding.TextUnmarshaler = (*Resistor)(nil)
