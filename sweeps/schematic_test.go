package sweeps_test

import (
	"slices"
	"strings"
	"testing"

	"nightbench/instruments"
	"nightbench/sweeps"
	"nightbench/sweeps/example"

	"github.com/google/go-cmp/cmp"
)

const head = `[board]
name = "Dosing pump driver"
rated_supply = ["5 V", "12 V"]
[timer]
part = "bipolar"
[timing]
capacitor = "100n 5%"
`

const direct = `
[driver]
stage = "none"
[load]
kind = "resistor"
resistance = "220 5%"
`

// The five networks as the circuit laws list them: which part joins which nodes,
// diodes anode first. Stage none with the load to ground unless the text says more.
var schematics = map[string]struct {
	text string
	want []string
}{
	"plain": {head + "network = \"plain\"\ncharge = \"10k\"\ndischarge = \"33k\"" + direct, []string{
		"timer supply discharge capacitor timer_out common", "charge supply discharge", "discharge discharge capacitor", "capacitor capacitor common", "load timer_out common"}},
	"bypassed, the pot below its stop": {head + "network = \"bypassed\"\ncharge = \"10k\"\ndischarge = \"pot\"\nstop = \"470\"\ncharge_diode = \"1N4148\"" + direct, []string{
		"timer supply discharge capacitor timer_out common", "charge supply discharge", "charge_diode discharge capacitor",
		"stop discharge_stop capacitor", "pot discharge discharge_stop", "capacitor capacitor common", "load timer_out common"}},
	"steered, the pot charges": {head + "network = \"steered\"\ncharge = \"pot\"\ndischarge = \"33k\"\ncharge_diode = \"1N4148\"\ndischarge_diode = \"BAT54\"" + direct, []string{
		"timer supply discharge capacitor timer_out common", "pot supply discharge", "charge_diode discharge capacitor",
		"discharge_diode capacitor discharge_end", "discharge discharge discharge_end", "capacitor capacitor common", "load timer_out common"}},
	"wiper": {head + "network = \"wiper\"\ncharge = \"1k\"\npot = \"100k 20%\"\nstop_up = \"470\"\ncharge_diode = \"1N4148\"\ndischarge_diode = \"1N4148\"" + direct, []string{
		"timer supply discharge capacitor timer_out common", "charge supply discharge", "stop_up pot_up charge_end", "pot pot_up discharge_end discharge",
		"charge_diode charge_end capacitor", "discharge_diode capacitor discharge_end", "capacitor capacitor common", "load timer_out common"}},
	"output-fed": {head + "network = \"output-fed\"\ncommon = \"1k\"\ncharge = \"10k\"\ndischarge = \"pot\"\ncharge_diode = \"1N4148\"\ndischarge_diode = \"1N4148\"" + direct, []string{
		"timer supply capacitor timer_out common", "common timer_out branch", "charge branch charge_end", "charge_diode charge_end capacitor",
		"pot branch discharge_end", "discharge_diode capacitor discharge_end", "capacitor capacitor common", "load timer_out common"}},
	"output-fed, one resistor": {head + "network = \"output-fed\"\ncommon = \"10k\"" + direct, []string{
		"timer supply capacitor timer_out common", "common timer_out capacitor", "capacitor capacitor common", "load timer_out common"}},
	"load to the supply, pin 5 fed": {head + "network = \"plain\"\ncharge = \"10k\"\ndischarge = \"33k\"\ncontrol = { voltage = \"3 V\", resistance = \"1k\" }" + direct + "to = \"supply\"", []string{
		"timer supply discharge capacitor control timer_out common", "control control common", "charge supply discharge", "discharge discharge capacitor", "capacitor capacitor common", "load supply timer_out"}},
}

func TestSchematics(t *testing.T) {
	for name, c := range schematics {
		b, err := sweeps.ReadBoard(written(t, "board.toml", c.text))
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		s := b.Schematic()
		var got []string
		for _, p := range s.Parts {
			line := p.Name
			for _, at := range p.Terminals {
				line += " " + at.Node
			}
			got = append(got, line)
		}
		if d := cmp.Diff(c.want, got); d != "" {
			t.Errorf("%s: %s", name, d)
		}
		drawable(t, name, s)
	}
}

// drawable checks what any drawing needs: every terminal on a line, every line
// met by two parts at least, the supply on top and common at the bottom.
func drawable(t *testing.T, name string, s sweeps.Schematic) {
	t.Helper()
	met := map[string]int{}
	for _, p := range s.Parts {
		if len(p.Terminals) < 2 || p.Value == "" {
			t.Errorf("%s: %+v", name, p)
		}
		for _, at := range p.Terminals {
			met[at.Node]++
		}
	}
	for _, n := range s.Nodes {
		if met[n.Name] == 0 || n.Inner && met[n.Name] < 2 {
			t.Errorf("%s: node %s ends nowhere", name, n.Name)
		}
		if !n.Inner && !slices.Contains(instruments.Nodes, instruments.Node(n.Name)) {
			t.Errorf("%s: no bench file can name %s", name, n.Name)
		}
		delete(met, n.Name)
	}
	if len(met) > 0 {
		t.Errorf("%s: no line for %v", name, met)
	}
	if s.Nodes[0].Name != "supply" || s.Nodes[len(s.Nodes)-1].Name != "common" {
		t.Errorf("%s: from %s to %s", name, s.Nodes[0].Name, s.Nodes[len(s.Nodes)-1].Name)
	}
}

func TestSchematicOfTheExample(t *testing.T) {
	b, err := sweeps.ReadBoard(written(t, "board.toml", example.Text(example.BoardPump)))
	if err != nil {
		t.Fatal(err)
	}
	s := b.Schematic()
	drawable(t, "example", s)
	parts := map[string]sweeps.SchematicPart{}
	for _, p := range s.Parts {
		parts[p.Name] = p
	}
	at := func(nodes ...string) (ts []sweeps.Terminal) {
		for _, n := range nodes {
			ts = append(ts, sweeps.Terminal{Node: n})
		}
		return ts
	}
	for _, want := range []sweeps.SchematicPart{
		{Name: "stop", Kind: "resistor", Value: "4.7\u00a0kΩ", Tolerance: "1\u00a0%", Written: "4k7 1%", Terminals: at("discharge_stop", "discharge_end")},
		{Name: "pot", Kind: "pot", Value: "the bench’s", Written: "pot", Terminals: at("discharge", "discharge_stop")},
		{Name: "flyback", Kind: "diode", Value: "1N5819", Written: "1N5819", Terminals: at("load_lo", "supply")},
		{Name: "load", Kind: "motor", Value: "12\u00a0Ω", Tolerance: "10\u00a0%", Written: "12 10%", Terminals: at("supply", "load_lo")},
		{Name: "transistor", Kind: "nmos", Value: "Rds 50\u00a0mΩ, Vgs 1.5\u00a0V", Terminals: at("load_lo", "common", "gate")},
	} {
		if d := cmp.Diff(want, parts[want.Name]); d != "" {
			t.Errorf("%s: %s", want.Name, d)
		}
	}
	if also := strings.Join(s.Nodes[0].Also, " "); also != "flyback_top load_hi" {
		t.Errorf("the supply's other names: %q", also)
	}
}
