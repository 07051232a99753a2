package sweeps_test

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"

	"github.com/google/go-cmp/cmp"
)

// written writes text to a file of its own.
func written(t *testing.T, name, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// Parts of a board file that the tests vary one at a time.
const (
	boardHead  = "[board]\nname = \"Dosing pump driver\"\nrated_supply = [\"5 V\", \"12 V\"]\n[timer]\npart = \"bipolar\"\n"
	steered    = "[timing]\nnetwork = \"steered\"\ncharge = \"10k\"\ndischarge = \"33k\"\ncapacitor = \"22n\"\ncharge_diode = \"1N4148\"\ndischarge_diode = \"1N4148\"\n"
	noStage    = "[driver]\nstage = \"none\"\n"
	resistor1k = "[load]\nkind = \"resistor\"\nresistance = \"1k\"\n"
)

func readBoard(t *testing.T, text string) (sweeps.Board, error) {
	t.Helper()
	return sweeps.ReadBoard(written(t, "board.toml", text))
}

func mustRead(t *testing.T, text string) sweeps.Board {
	t.Helper()
	b, err := readBoard(t, text)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func TestReadBoardReadsEveryKey(t *testing.T) {
	b, err := sweeps.ReadBoard("example/pump-driver-b.toml")
	if err != nil {
		t.Fatal(err)
	}
	if b.Name != "Dosing pump driver" || b.Revision != "B" || b.RatedSupply[0].SI() != 7 || b.RatedSupply[1].SI() != 12 || b.Timer.Part != "bipolar" {
		t.Errorf("head: %+v", b)
	}
	ti := b.Timing
	if ti.Network != sweeps.Steered || ti.Charge.Value.SI() != 33e3 || ti.Charge.Value.Tolerance != 0.01 || !ti.Discharge.Pot || !ti.UsesPot() ||
		ti.Stop.SI() != 4700 || !near(ti.Capacitor.SI(), 6.8e-9) || ti.Capacitor.Tolerance != 0.05 ||
		ti.ChargeDiode != (sweeps.Diode{Name: "1N4148"}) || ti.DischargeDiode != (sweeps.Diode{Name: "1N4148"}) || ti.Control != nil {
		t.Errorf("timing: %+v", ti)
	}
	d := b.Driver
	if d.Stage != sweeps.StageNMOS || d.Part != (sweeps.Transistor{RdsOn: 0.05, VgsTh: 1.5}) || d.GateResistor.SI() != 100 || d.BaseResistor != nil || d.Flyback.Name != "1N5819" {
		t.Errorf("driver: %+v", d)
	}
	l := b.Load
	got := []float64{l.Resistance.SI(), l.Inductance.SI(), l.TorqueConstant.SI(), l.StaticTorque.SI(), l.CoulombTorque.SI(), l.ViscousTorque.SI(), l.Inertia.SI() * 1e7}
	want := []float64{12, 5e-3, 8e-3, 0.6e-3, 0.4e-3, 0.2e-6, 5}
	if l.Kind != sweeps.Motor || l.ToSupply || cmp.Diff(want, got, approx) != "" {
		t.Errorf("load: %+v", l)
	}
	text, err := os.ReadFile(b.Path)
	if err != nil || string(text) != b.Text {
		t.Errorf("text is not verbatim: %v", err)
	}
}

// near is equal but for the rounding of decimal prefixes.
func near(a, b float64) bool { return a == b || math.Abs(a-b) < 1e-9*math.Abs(b) }

var approx = cmp.Comparer(near)

func TestTimerOverrides(t *testing.T) {
	b := mustRead(t, boardHead+`threshold = 0.667
trigger = 0.333
discharge_offset = "37 mV"
discharge_resistance = "9.5 20%"
delay = "300 ns"
trigger_current = "0.5 uA"
threshold_current = "30 nA"
quiescent = "6 mA 30%"
drop = [["0 A", "1.2 V"], ["100 mA", "1.7 V"]]
low = [["10 mA", "0.1 V"]]
max_output_current = "200 mA"
`+steered+noStage+resistor1k)
	ti := b.Timer
	got := []float64{ti.Threshold.SI(), ti.Trigger.SI(), ti.DischargeOffset.SI(), ti.DischargeResistance.SI(), ti.DischargeResistance.Tolerance, ti.Delay.SI(),
		ti.TriggerCurrent.SI(), ti.ThresholdCurrent.SI(), ti.Quiescent.SI(), ti.MaxOutputCurrent.SI(), ti.Drop[1].Current.SI(), ti.Drop[1].Voltage.SI(), ti.Low[0].Voltage.SI()}
	want := []float64{0.667, 0.333, 0.037, 9.5, 0.2, 300e-9, 0.5e-6, 30e-9, 6e-3, 0.2, 0.1, 1.7, 0.1}
	if d := cmp.Diff(want, got, approx); d != "" {
		t.Error(d)
	}
	if plain := mustRead(t, boardHead+steered+noStage+resistor1k).Timer; cmp.Diff(sweeps.Timer{Part: "bipolar"}, plain, cmp.AllowUnexported(si.Voltage{})) != "" {
		t.Errorf("nothing overridden: %+v", plain)
	}
}

// Each network with exactly the keys that the circuit laws give it.
func TestNetworksTakeTheirKeys(t *testing.T) {
	for _, c := range []struct {
		name, timing string
		check        func(sweeps.Timing) bool
	}{
		{"Plain", "network = \"plain\"\ncharge = \"5k\"\ndischarge = 3000", func(v sweeps.Timing) bool {
			return v.ChargeDiode.None && v.DischargeDiode.None && v.Discharge.Value.SI() == 3000
		}},
		{"PlainSaysNone", "network = \"plain\"\ncharge = \"5k\"\ndischarge = \"3k\"\ncharge_diode = \"none\"\ndischarge_diode = \"none\"", func(v sweeps.Timing) bool {
			return v.ChargeDiode == sweeps.Diode{None: true}
		}},
		{"Bypassed", "network = \"bypassed\"\ncharge = \"5k\"\ndischarge = \"pot\"\nstop = 470\ncharge_diode = \"BAT54\"", func(v sweeps.Timing) bool {
			return v.ChargeDiode.Name == "BAT54" && v.DischargeDiode.None && v.Stop.SI() == 470 && v.UsesPot()
		}},
		{"SteeredInline", "network = \"steered\"\ncharge = \"pot\"\ndischarge = \"3k\"\ncharge_diode = { is = \"2.52 nA\", n = 2, rs = 0.568 }\ndischarge_diode = { is = 2.52e-9, n = 1.752 }", func(v sweeps.Timing) bool {
			return v.ChargeDiode == sweeps.Diode{Is: 2.52e-9, N: 2, Rs: 0.568} && v.DischargeDiode == sweeps.Diode{Is: 2.52e-9, N: 1.752} && v.Charge.Pot
		}},
		{"Wiper", "network = \"wiper\"\ncharge = \"1k\"\npot = \"100k\"\nstop_up = 100\nstop_down = 220\ncharge_diode = \"1N4148\"\ndischarge_diode = \"1N4148\"", func(v sweeps.Timing) bool {
			return v.Track.Value.SI() == 100e3 && v.StopUp.SI() == 100 && v.StopDown.SI() == 220 && !v.UsesPot()
		}},
		{"WiperOfTheBench", "network = \"wiper\"\ncharge = \"1k\"\npot = \"pot\"\ncharge_diode = \"1N4148\"\ndischarge_diode = \"1N4148\"", func(v sweeps.Timing) bool {
			return v.Track.Pot && v.UsesPot() && v.StopUp.SI() == 0
		}},
		{"OutputFed", "network = \"output-fed\"\ncommon = 100\ncharge = \"10k\"\ndischarge = \"22k\"\ncharge_diode = \"1N4148\"\ndischarge_diode = \"1N4148\"", func(v sweeps.Timing) bool {
			return v.Common.Value.SI() == 100 && v.Charge.Value.SI() == 10e3 && v.Discharge.Value.SI() == 22e3
		}},
		{"OutputFedOneResistor", "network = \"output-fed\"\ncommon = \"pot\"", func(v sweeps.Timing) bool {
			return v.Common.Pot && v.ChargeDiode.None && v.DischargeDiode.None
		}},
		{"Control", "network = \"plain\"\ncharge = \"5k\"\ndischarge = \"3k\"\ncontrol = { voltage = \"3 V\", resistance = \"10k\" }", func(v sweeps.Timing) bool {
			return v.Control.Voltage.SI() == 3 && v.Control.Resistance.SI() == 10e3
		}},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := mustRead(t, boardHead+"[timing]\ncapacitor = \"22n\"\n"+c.timing+"\n"+noStage+resistor1k)
			if !c.check(b.Timing) {
				t.Errorf("%+v", b.Timing)
			}
		})
	}
}

func TestStagesTakeTheirKeys(t *testing.T) {
	for _, c := range []struct {
		name, driver string
		check        func(sweeps.Driver) bool
	}{
		{"None", "stage = \"none\"", func(d sweeps.Driver) bool { return d.Flyback.None && d.Part == sweeps.Transistor{} }},
		{"NPN", "stage = \"npn\"\npart = \"2N2222\"\nbase_resistor = \"470 5%\"\nflyback = \"none\"", func(d sweeps.Driver) bool {
			return d.Part.Name == "2N2222" && d.BaseResistor.SI() == 470 && d.Flyback == sweeps.Diode{None: true}
		}},
		{"DarlingtonInline", "stage = \"darlington\"\npart = { vbe = 1.4, vce_sat = \"0.9 V\", hfe_min = 1000 }\nbase_resistor = 2200\nflyback = { is = 1.41e-8, n = 1.984, rs = 0.034 }", func(d sweeps.Driver) bool {
			return d.Part == sweeps.Transistor{VBE: 1.4, VCESat: 0.9, HFEMin: 1000} && d.Flyback.Is == 1.41e-8
		}},
		{"NMOS", "stage = \"nmos\"\npart = \"logic-level-50m\"", func(d sweeps.Driver) bool { return d.GateResistor == nil && d.BaseResistor == nil }},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := mustRead(t, boardHead+steered+"[driver]\n"+c.driver+"\n"+resistor1k)
			if !c.check(b.Driver) {
				t.Errorf("%+v", b.Driver)
			}
		})
	}
}

func TestLoads(t *testing.T) {
	b := mustRead(t, boardHead+steered+noStage+resistor1k+"to = \"supply\"\n")
	if !b.Load.ToSupply || b.Load.Kind != sweeps.ResistorLoad {
		t.Errorf("%+v", b.Load)
	}
	b = mustRead(t, boardHead+steered+"[driver]\nstage = \"none\"\nflyback = \"none\"\n[load]\nkind = \"motor\"\nresistance = 12\ninductance = \"5 mH\"\ntorque_constant = \"8 mV s/rad\"\ncoulomb_torque = \"0.4 mN m\"\nquadratic_torque = \"0.3 nN m s2\"\nbrush_drop = \"0.4 V\"\n")
	l := b.Load
	if l.StaticTorque != l.CoulombTorque || l.Inertia.SI() != 0 || l.BrushDrop.SI() != 0.4 || l.QuadraticTorque.SI() != 0.3e-9 {
		t.Errorf("%+v", l)
	}
}

// One mistake each, and the beginning of what is told about it.
func TestBoardMistakes(t *testing.T) {
	motor := "[load]\nkind = \"motor\"\nresistance = 12\ninductance = \"5 mH\"\ntorque_constant = \"8 mV s/rad\"\n"
	for _, c := range []struct{ name, text, want string }{
		{"RatedFalling", strings.Replace(boardHead, `["5 V", "12 V"]`, `["12 V", "5 V"]`, 1) + steered + noStage + resistor1k, `:3: board.rated_supply = ["12 V", "5 V"]: give the lowest and the highest`},
		{"ThresholdAboveOne", boardHead + "threshold = 1.2\n" + steered + noStage + resistor1k, ":6: timer.threshold = 1.2: has to be below 1"},
		{"TableFalling", boardHead + "drop = [[\"0.1 A\", \"1 V\"], [\"0.1 A\", \"2 V\"]]\n" + steered + noStage + resistor1k, `:6: timer.drop = [["0.1 A", "1 V"], ["0.1 A", "2 V"]]: row 2`},
		{"NegativeDelay", boardHead + "delay = \"-1 us\"\n" + steered + noStage + resistor1k, `:6: timer.delay = "-1 us": can't be below zero`},
		{"SteeredWithoutD2", boardHead + strings.Replace(steered, `discharge_diode = "1N4148"`, `discharge_diode = "none"`, 1) + noStage + resistor1k, `:12: timing.discharge_diode = "none": network "steered" needs it; without it this is network = "bypassed"`},
		{"SteeredWithoutD1", boardHead + strings.Replace(steered, `charge_diode = "1N4148"`, `charge_diode = "none"`, 1) + noStage + resistor1k, `:11: timing.charge_diode = "none": network "steered" needs it; give a diode`},
		{"StopWithoutPot", boardHead + steered + "stop = 470\n" + noStage + resistor1k, ":13: timing.stop = 470: it stands in series with the pot"},
		{"WiperWithStop", boardHead + strings.NewReplacer("steered", "wiper", "discharge =", "pot =").Replace(steered) + "stop = 470\n" + noStage + resistor1k, `:13: timing.stop = 470: network "wiper" has stop_up and stop_down instead`},
		{"PlainWithDiode", boardHead + "[timing]\nnetwork = \"plain\"\ncharge = 1000\ndischarge = 1000\ncapacitor = \"1n\"\ncharge_diode = \"1N4148\"\n" + noStage + resistor1k, `:11: timing.charge_diode = "1N4148": network "plain" has no diode there`},
		{"OutputFedOneDiode", boardHead + strings.NewReplacer("steered", "output-fed", "discharge_diode = \"1N4148\"", "discharge_diode = \"none\"").Replace(steered) + noStage + resistor1k, `:12: timing.discharge_diode = "none": network "output-fed" has both diodes`},
		{"OutputFedNoDiodes", boardHead + "[timing]\nnetwork = \"output-fed\"\ncommon = 1000\ncapacitor = \"1n\"\ncharge = 1000\n" + noStage + resistor1k, `:10: timing.charge = 1000: network "output-fed" without charge_diode and discharge_diode has one resistor, common`},
		{"ZeroResistor", boardHead + strings.Replace(steered, `"33k"`, "0", 1) + noStage + resistor1k, ":9: timing.discharge = 0: a resistance has to be above zero"},
		{"NotAResistance", boardHead + strings.Replace(steered, `"33k"`, `"pots"`, 1) + noStage + resistor1k, `:9: timing.discharge = "pots": "pots" is not a resistance; write it like "4k7", or "pot" for the bench's pot`},
		{"DiodeUnknownKey", boardHead + strings.Replace(steered, `discharge_diode = "1N4148"`, `discharge_diode = { is = 1e-9, n = 1.7, r = 1 }`, 1) + noStage + resistor1k, ":12: timing.discharge_diode.r = 1: unknown key"},
		{"DiodeNegative", boardHead + strings.Replace(steered, `discharge_diode = "1N4148"`, `discharge_diode = { is = -1e-9, n = 1.7 }`, 1) + noStage + resistor1k, ":12: timing.discharge_diode.is = -1e-9: has to be above zero"},
		{"NoBaseResistor", boardHead + steered + "[driver]\nstage = \"npn\"\npart = \"2N2222\"\n" + resistor1k, ":13: driver.base_resistor: is missing"},
		{"GateOnNPN", boardHead + steered + "[driver]\nstage = \"npn\"\npart = \"2N2222\"\nbase_resistor = 470\ngate_resistor = 10\n" + resistor1k, `:17: driver.gate_resistor = 10: stage "npn" has no use for it`},
		{"PartWithoutStage", boardHead + steered + noStage + "part = \"2N2222\"\n" + resistor1k, `:15: driver.part = "2N2222": stage "none" has no use for it`},
		{"MOSWithVBE", boardHead + steered + "[driver]\nstage = \"nmos\"\npart = { rds_on = 0.05, vgs_th = 1, vbe = 0.7 }\n" + resistor1k, ":15: driver.part.vbe = 0.7: unknown key (accepted here: rds_on, vgs_th)"},
		{"ToWithStage", boardHead + steered + "[driver]\nstage = \"nmos\"\npart = \"x\"\n" + resistor1k + "to = \"ground\"\n", `:19: load.to = "ground": with stage "nmos" the load always goes to the supply`},
		{"MotorWithoutFlyback", boardHead + steered + noStage + motor, ":13: driver.flyback: is missing; a motor needs"},
		{"ZeroInertia", boardHead + steered + noStage + "flyback = \"none\"\n" + motor + "inertia = \"0 g cm2\"\n", `:21: load.inertia = "0 g cm2": has to be above zero`},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := readBoard(t, c.text)
			if err == nil {
				t.Fatal("no mistake told")
			}
			_, got, _ := strings.Cut(err.Error(), "board.toml")
			if !strings.HasPrefix(got, c.want) || strings.Contains(got, "\n") {
				t.Errorf("got  %s\nwant %s", got, c.want)
			}
		})
	}
}

func TestEveryMistakeIsTold(t *testing.T) {
	_, err := readBoard(t, "[board]\nname = 5\n[timing]\nnetwork = \"none\"\ncharge = \"x\"\n[laod]\n")
	if err == nil {
		t.Fatal("no mistake told")
	}
	for _, want := range []string{"board.name", "board.rated_supply", "the table [timer] is missing", "timing.network", "timing.capacitor", "the table [driver] is missing", `did you mean "load"?`} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%q is not told in\n%v", want, err)
		}
	}
}
