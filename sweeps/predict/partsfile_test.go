package predict

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
	"nightbench/sweeps"
)

func ownParts(texts ...string) (files []sweeps.File) {
	for i, text := range texts {
		files = append(files, sweeps.File{Role: sweeps.RoleParts, Name: fmt.Sprintf("own-%d.parts.toml", i+1), Text: text})
	}
	return files
}

// Users' parts stand beside the built-in ones, and replace those of the same name.
func TestOwnParts(t *testing.T) {
	b := pump()
	b.Parts = ownParts(`
[[diode]]
name = "mine"
is = { typical = 1e-9 }
n = { typical = 1.8 }
`, `
[[diode]]
name = "1n4148"
is = { typical = 5e-9, low = 1e-9, high = 1e-8, shape = "log", source = "measured" }
n = { typical = 1.9 }
`)
	b.Timing.ChargeDiode.Name = "mine"
	m := mustNew(t, b, Options{})
	if m.nominal.chargeDiode.is != 1e-9 || m.nominal.dischargeDiode.is != 5e-9 {
		t.Errorf("diodes %+v, %+v", m.nominal.chargeDiode, m.nominal.dischargeDiode)
	}
}

// A mistake in a parts file is told with file, line and key.
func TestMistakesInOwnParts(t *testing.T) {
	for _, c := range []struct {
		text, key string
		line      int
		words     string
	}{
		{"[[diode]]\nname = \"x\"\nis = { typical = 1e-9, low = 1e-8 }\nn = { typical = 1 }", "diode[1].is", 3, "low 1e-08"},
		{"[[diode]]\nname = \"x\"\ncolour = \"red\"", "diode[1].colour", 3, "unknown key (accepted here: "},
		{"[[diode]]\nname = \"x\"\nis = { typcial = 1e-9 }\nn = { typical = 1 }", "diode[1].is.typcial", 3, "did you mean \"typical\"?"},
		{"[diode]\nname = \"x\"", "diode", 1, "write it as [[diode]]"},
		{"[[lamp]]\nname = \"x\"", "lamp", 1, "unknown"},
		{"[[diode]]\nname = \"x\"\nis = \"much\"", "diode[1].is", 3, "one table"},
		{"[[diode]]\nname = \"x\"\nis = { typical = \"much\" }", "diode.is", 3, "without quotes"},
		{"[[diode]]\nname = \"x\"\nis = { typical = 1e-9, shape = \"bell\" }\nn = { typical = 1 }", "diode[1].is", 3, "triangular"},
		{"[[timer]]\nname = \"x\"\nthreshold = { typical = 2 }", "timer[1].threshold", 3, "between 0 and 1"},
		{"[[transistor]]\nname = \"x\"\nkind = \"tube\"", "transistor[1].kind", 3, "nmos"},
		{"[[transistor]]\nname = \"x\"\nkind = \"nmos\"\nrds = [[4.5, 0.1], [2.5, 0.05]]", "transistor[1].rds", 4, "rds row 2"},
		{"[[motor]]\nname = \"x\"", "motor[1]", 1, "torque_constant"},
		{"[[motor]]\nname = \"x\"\nresistance = { typical = 5 }\ntorque_constant = { typical = 0.01 }\nmax_current = { typical = -1 }", "motor[1].max_current", 5, "negative"},
		{"[[motor]]\nname = \"x\"\nresistance = { typical = 5 }\ntorque_constant = { typical = 0.01 }\n[[motor]]\nname = \"X\"\nresistance = { typical = 5 }\ntorque_constant = { typical = 0.01 }", "motor[2].name", 6, "already"},
		{"[[diode]]\nname = ", "", 2, ""},
	} {
		b := pump()
		b.Parts = ownParts(c.text)
		_, err := New(b, Options{})
		var e *userfile.Error
		if !errors.As(err, &e) {
			t.Errorf("%s\ngives %v, want a mistake in the file", c.text, err)
			continue
		}
		if e.File != "own-1.parts.toml" || e.Line != c.line || e.Key != c.key || !strings.Contains(e.Want, c.words) {
			t.Errorf("%s\ngives line %d, key %q: %v", c.text, e.Line, e.Key, err)
		}
	}
	b := pump()
	mine := "[[diode]]\nname = \"mine\"\nis = { typical = 1e-9 }\nn = { typical = 1.8 }"
	b.Parts = ownParts(mine, mine)
	if _, err := New(b, Options{}); err == nil || !strings.HasPrefix(err.Error(), "own-2.parts.toml:2: diode[1].name") {
		t.Errorf("the same part in two files: %v", err)
	}
}

// motorOf is the example board with a catalogue motor whose file is the user's.
func motorOf(part string) sweeps.Board {
	b := pump()
	b.Parts = ownParts(`
[[motor]]
name = "membrane pump"
resistance = { typical = 12, low = 10.8, high = 13.2 }
inductance = { typical = 5e-3 }
torque_constant = { typical = 8e-3 }
coulomb_torque = { typical = 0.4e-3 }
viscous_torque = { typical = 0.2e-6 }
inertia = { typical = 0.5e-7 }
max_current = { typical = 0.5 }
max_power = { typical = 2 }
`)
	b.Load = sweeps.Load{Kind: sweeps.Motor, Part: part}
	return b
}

// A catalogue motor is what its figures would be in the board file; the file's own
// figures and ratings go before the part's.
func TestMotorOfTheCatalogue(t *testing.T) {
	named := mustNew(t, motorOf("membrane pump"), Options{})
	want := load{r: 12, l: 5e-3, k: 8e-3, static: 0.4e-3, coulomb: 0.4e-3, viscous: 0.2e-6, inertia: 0.5e-7}
	if named.nominal.load != want {
		t.Errorf("load %+v, want %+v", named.nominal.load, want)
	}
	written := motorOf("membrane pump")
	read(t, map[string]interface{ UnmarshalText([]byte) error }{"15": &written.Load.Resistance, "0.6 mN m": &written.Load.StaticTorque})
	want.r, want.static = 15, 0.6e-3
	if m := mustNew(t, written, Options{}); m.nominal.load != want {
		t.Errorf("load %+v, want %+v", m.nominal.load, want)
	}
	for _, p := range named.Parts() {
		if p.Name == "load.resistance" && (math.Abs(p.Low-10.8) > 1e-12 || math.Abs(p.High-13.2) > 1e-12) {
			t.Errorf("resistance from %g to %g ohm", p.Low, p.High)
		}
	}
	if _, err := New(motorOf("pump of nobody"), Options{}); err == nil || !strings.Contains(err.Error(), `load.part: no motor "pump of nobody"`) || !strings.Contains(err.Error(), "1331T012SR") {
		t.Errorf("unknown motor: %v", err)
	}
}

// A motor's rating refuses a plan, from the part as from the board file: at nearly
// full duty a held rotor draws about 9 V over 12 ohm, 0.7 A, and the winding takes 5 to 6 W.
func TestMotorRatingsRefuse(t *testing.T) {
	refusals := func(b sweeps.Board) (words string) {
		found, err := mustNew(t, b, Options{}).Judge([]Setting{at9V(1e3)})
		if err != nil {
			t.Fatal(err)
		}
		for _, f := range found {
			if f.Refuse {
				words += f.Words + "\n"
			}
		}
		return words
	}
	for _, want := range []string{"rotor held, motor: mean current", "of the 500", "rotor held, motor: heat in the winding"} {
		if got := refusals(motorOf("membrane pump")); !strings.Contains(got, want) {
			t.Errorf("refused for %q, want %q", got, want)
		}
	}
	b := motorOf("membrane pump")
	amps, watts := si.Amperes(2), si.Watts(20)
	b.Load.MaxCurrent, b.Load.MaxPower = &amps, &watts
	if got := refusals(b); got != "" {
		t.Errorf("with the board file's own ratings: %s", got)
	}
}
