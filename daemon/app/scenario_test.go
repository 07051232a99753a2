package app

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/instruments/practice"
	"nightbench/instruments/practice/circuit"
	"nightbench/sweeps"
	"nightbench/sweeps/example"
)

func TestScenariosBuiltIn(t *testing.T) {
	names := ScenarioNames()
	if got := strings.Join(names, " "); got != "capacitor diode healthy" {
		t.Errorf("built in: %s", got)
	}
	for _, n := range names {
		s, err := ReadScenario(n)
		if err != nil || s.Name == "" || s.About == "" || s.Seed == nil {
			t.Errorf("%s: %+v, %v", n, s, err)
		}
	}
	if _, err := ReadScenario("none-such"); err == nil || !strings.Contains(err.Error(), "capacitor, diode, healthy") {
		t.Errorf("an unknown scenario: %v", err)
	}
}

const wholeScenario = `
[scenario]
name = "A bad night"
seed = 3
[supply]
stays_off = true
resumes = true
watchdog = "10 s"
[scope]
bits = 12
form = "counts-origin"
tail = "two-nl"
percent = true
[climate]
room = "19 degC"
rise_kelvin = 4
capacitor_ppm_per_kelvin = -150
[[substitute]]
part = "load.resistance"
times = 1.2
[[fault]]
kind = "late"
on = "average"
at = "10 min"
for = "1 min"
times = 2
size = "4 s"
[[fault]]
kind = "drift"
size = "3 %"
[[fault]]
kind = "short"
size = "0.5"
[[fault]]
kind = "garbage"
on = "pot"
size = 12
`

func TestScenarioFile(t *testing.T) {
	s, err := ParseScenario("bad-night.toml", []byte(wholeScenario))
	if err != nil {
		t.Fatal(err)
	}
	want := []Planned{
		{practice.Fault{Kind: practice.Late, On: "average", Size: 4, Times: 2, For: 60}, 10 * time.Minute},
		{practice.Fault{Kind: practice.Drift, Size: 0.03}, 0},
		{practice.Fault{Kind: practice.Short, Size: 0.5}, 0},
		{practice.Fault{Kind: practice.Garbage, On: "pot", Size: 12}, 0},
	}
	if len(s.Faults) != len(want) {
		t.Fatalf("%+v", s.Faults)
	}
	for i, f := range s.Faults {
		if f != want[i] {
			t.Errorf("fault %d: %+v, expected %+v", i+1, f, want[i])
		}
	}
	if s.Supply != (practice.Supply{StaysOff: true, Resumes: true, Watchdog: 10}) || s.Scope.Bits != 12 || s.Scope.Form != practice.CountsOrigin || s.Scope.Tail != practice.TailTwoNL {
		t.Errorf("%+v %+v", s.Supply, s.Scope)
	}
	if c := s.Climate; c == nil || math.Abs(c.Room-292.15) > 1e-9 || c.Rise != 4 || math.Abs(c.CapacitorPerKelvin+150e-6) > 1e-12 {
		t.Errorf("%+v", c)
	}
}

func TestScenarioMistakesNameTheirLine(t *testing.T) {
	for _, c := range []struct{ text, words string }{
		{"[scenario]\nname = \"x\"\ncolour = \"red\"\n", "scenario.toml:3: scenario.colour"},
		{"[scenario]\nname = \"x\"\n[[fault]]\nkind = \"silense\"\n", "scenario.toml:4: fault[1].kind"},
		{"[scenario]\nname = \"x\"\n[[fault]]\nkind = \"silence\"\nsize = 3\n", "scenario.toml:5: fault[1].size"},
		{"[scenario]\nname = \"x\"\n[[fault]]\nkind = \"late\"\nsize = 3\n", "scenario.toml:5: fault[1].size"},
		{"[scenario]\nname = \"x\"\n[[substitute]]\npart = \"capacitor\"\n", "scenario.toml:3: substitute[1]"},
		{"[scenario]\nname = \"x\"\n[[substitute]]\npart = \"flux\"\nvalue = \"3\"\n", "scenario.toml:5: substitute[1].value"},
		{"[scenario]\nname = \"x\"\n[scope]\nbits = 10\n", "scenario.toml:4: scope.bits"},
		{"[scenario]\nname = \"x\"\n[climate]\nrise_kelvin = 3\n", "scenario.toml:3: climate.room"},
	} {
		_, err := ParseScenario("scenario.toml", []byte(c.text))
		if err == nil || !strings.Contains(err.Error(), c.words) {
			t.Errorf("%q: %v, expected %q", c.text, err, c.words)
		}
	}
}

func TestFaultOnTheCommandLine(t *testing.T) {
	p, err := ParseFault("late on=average size=4s at=10min for=30s times=2")
	if err != nil || p != (Planned{practice.Fault{Kind: practice.Late, On: "average", Size: 4, Times: 2, For: 30}, 10 * time.Minute}) {
		t.Errorf("%+v, %v", p, err)
	}
	if got := p.String(); got != "late on average, 10m0s after the start, for 30 s, 2 replies" {
		t.Errorf("in words: %q", got)
	}
	if p, err := ParseFault("garbage on=pot size=12"); err != nil || p.Size != 12 {
		t.Errorf("%+v, %v", p, err)
	}
	for words, want := range map[string]string{"": "no fault is named", "late average": "no key=value", "boom": "--fault:1: kind", "late size=4V": "--fault:2: size"} {
		if _, err := ParseFault(words); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v, expected %q", words, err, want)
		}
	}
}

// open is a practice bench of a scenario, nothing but the circuit behind it.
func openScenario(t *testing.T, text string, seed uint64) (*PracticeBench, string, error) {
	t.Helper()
	s, err := ParseScenario("test.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	write := func(name string) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(example.Text(name)), 0o600); err != nil {
			t.Fatal(err)
		}
		return path
	}
	board, err := sweeps.ReadBoard(write(example.BoardPump))
	if err != nil {
		t.Fatal(err)
	}
	wired, err := bench.Read(write(example.Bench))
	if err != nil {
		t.Fatal(err)
	}
	truth := filepath.Join(dir, "truth.json")
	p, err := OpenPractice(t.Context(), PracticeOptions{Board: board, Wiring: wired.Wiring, Clock: instruments.NewClock(1), Seed: seed, Scenario: s, Truth: truth, Ports: filepath.Join(dir, "ports")})
	if err == nil {
		t.Cleanup(func() { p.Close() })
	}
	return p, truth, err
}

// The board that is simulated, the sealed file, and the scenario say the same.
func TestSealedTruth(t *testing.T) {
	p, path, err := openScenario(t, "[scenario]\nname = \"x\"\nseed = 5\n[[substitute]]\npart = \"capacitor\"\nvalue = \"33n\"\n[[substitute]]\npart = \"charge_diode\"\nfitted = \"1N5819\"\n", 1)
	if err != nil {
		t.Fatal(err)
	}
	truth, err := OpenSealed(path)
	if err != nil {
		t.Fatal(err)
	}
	var b circuit.Board
	if err := p.Alter(func(c *circuit.Board) { b = *c }); err != nil {
		t.Fatal(err)
	}
	warm := 1 + truth.Climate.CapacitorPerKelvin*(b.Ambient-circuit.Nominal)
	if truth.Seed != 5 || math.Abs(truth.Parts["capacitor"]/33e-9-1) > 1e-9 || math.Abs(b.Timing.Capacitance/(33e-9*warm)-1) > 1e-9 {
		t.Errorf("seed %d, capacitor %g F in the file, %g F on the board at %g K", truth.Seed, truth.Parts["capacitor"], b.Timing.Capacitance, b.Ambient)
	}
	if d := b.Timing.ChargeDiode; d.Is != truth.Parts["charge_diode.is"] || d.Is < 1e-5 || d.Eg != 0.69 || truth.Fitted["charge_diode"] != "1N5819" {
		t.Errorf("charge diode %+v, in the file %g A", d, truth.Parts["charge_diode.is"])
	}
	if r := b.Timing.Common; r != truth.Parts["charge"] || r == math.Round(r/100)*100 {
		t.Errorf("charging resistor %g Ω on the board, %g in the file: drawn within its tolerance", r, truth.Parts["charge"])
	}
	if b.Load.Cogging == 0 || b.Load.Ripple == 0 || b.Load.ThermalResistance == 0 {
		t.Errorf("the motor has no life of its own: %+v", b.Load)
	}
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if strings.Contains(string(text), "capacitor") {
		t.Error("the truth can be read by accident")
	}
	broken := strings.Replace(string(text), `"seal": "`, `"seal": "0`, 1)
	if err := os.WriteFile(path, []byte(broken), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := OpenSealed(path); err == nil || !strings.Contains(err.Error(), "seal is broken") {
		t.Errorf("a changed file: %v", err)
	}
}

func TestSubstitutesThatDoNotFit(t *testing.T) {
	for text, want := range map[string]string{
		"part = \"base_resistor\"\ntimes = 2":           "no part",
		"part = \"capacitor\"\nfitted = \"1N5819\"":     "no diode \"capacitor\"",
		"part = \"charge_diode\"\nfitted = \"1N60\"":    "there are 1N4148",
		"part = \"charge_diode.is\"\nfitted = \"1N60\"": "no diode",
	} {
		_, _, err := openScenario(t, "[scenario]\nname = \"x\"\n[[substitute]]\n"+text+"\n", 1)
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v, expected %q", text, err, want)
		}
	}
	if _, _, err := openScenario(t, "[scenario]\nname = \"x\"\n[[fault]]\nkind = \"silence\"\non = \"lamp\"\n", 1); err == nil || !strings.Contains(err.Error(), "one of supply") {
		t.Errorf("a fault on an instrument that is not there: %v", err)
	}
}
