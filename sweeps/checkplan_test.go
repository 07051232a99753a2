package sweeps_test

import (
	"errors"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
	"nightbench/sweeps"
)

// night is plan, board and bench, to be changed by a test.
type night struct {
	plan  sweeps.Plan
	board sweeps.Board
	bench *instruments.Wiring
}

func exampleNight(t *testing.T, plan string) night {
	t.Helper()
	p, b, err := sweeps.ReadPlan("example/" + plan)
	if err != nil {
		t.Fatal(err)
	}
	f, err := bench.Read("example/bench.toml")
	if err != nil {
		t.Fatal(err)
	}
	return night{p, b, &f.Wiring}
}

func (n night) check() error { return sweeps.CheckPlan(n.plan, n.board, n.bench) }

func noPotBoard(t *testing.T) sweeps.Board {
	b, err := sweeps.ReadBoard("../testdata/fixed-duty.board.toml")
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// Each changes one thing of a good night; want is the one mistake told of it.
func TestCheckPlanTells(t *testing.T) {
	for _, c := range []struct {
		name   string
		plan   string
		change func(*night)
		want   string
	}{
		{"AboveBenchVoltage", "sample.toml", func(n *night) { n.bench.Supply.MaxVoltage = 11 }, `sample.toml:10: axis[1].values = "12 V": 12 V is above what bench "Pump bench" allows, 11 V (supply.max_voltage)`},
		{"BelowRating", "sample.toml", func(n *night) { n.board.RatedSupply[0] = si.Volts(9.5) }, `sample.toml:10: axis[1].values = "9 V": 9 V is below the lowest rated supply of the board, 9.5 V`},
		{"NoSupplyAxis", "sample.toml", func(n *night) { n.plan.Axes = n.plan.Axes[1:] }, "sample.toml:8: axis: no axis sets supply_voltage"},
		{"NoPotAxis", "sample.toml", func(n *night) { n.plan.Axes = n.plan.Axes[:1] }, "sample.toml:8: axis: the board is timed by the pot and no axis says where it stands"},
		{"NoPotOnBench", "sample.toml", func(n *night) { n.bench.Pot = nil }, `sample.toml:13: axis[2].set = "pot_resistance": bench "Pump bench" has no pot; add [pot]`},
		{"WiperOfTheBench", "sample.toml", func(n *night) { n.board.Timing.Track.Pot = true }, `sample.toml:13: axis[2].set = "pot_resistance": both ends of the pot are in the timing network (network = "wiper")`},
		{"BelowTheWiper", "sample.toml", func(n *night) { n.bench.Pot.Wiper = 2000 }, `sample.toml:14: axis[2].from = "1k": 1 kΩ is out of the pot's reach, 2 kΩ to 102 kΩ`},
		{"TerminalVoltage", "sample.toml", func(n *night) { n.bench.Pot.MaxTerminalVoltage = 5.5 }, `sample.toml:13: axis[2].set = "pot_resistance": at 12 V the pot's terminals would see more than their 5.5 V`},
		{"CodeOfAnotherPot", "sample.toml", func(n *night) { n.plan.Axes[1].Set = sweeps.SetPotCode }, `sample.toml:14: axis[2].from = "1k": code 1000 is none of this pot, 0 to 256`},
		{"WarmUpVoltage", "overnight.toml", func(n *night) { n.plan.WarmUp.At.Supply = si.Volts(15) }, `overnight.toml:22: warm_up.at.supply_voltage = "9 V": 15 V is above the highest rated supply`},
		{"WarmUpNowhere", "overnight.toml", func(n *night) { n.plan.WarmUp.At.Pot = si.Ohms(0) }, `overnight.toml:22: warm_up.at.pot_resistance = "10k": is missing; the board is timed by the pot`},
		{"WarmUpOutOfReach", "overnight.toml", func(n *night) { n.plan.WarmUp.At.Pot = si.Ohms(2e5) }, `overnight.toml:22: warm_up.at.pot_resistance = "10k": 200 kΩ is out of the pot's reach`},
		{"WarmUpTooLong", "overnight.toml", func(n *night) { n.plan.AtMost = time.Minute }, `overnight.toml:23: warm_up.for = "20 min": is not shorter than the plan's at_most, 1m0s`},
		{"WatchDuty", "sample.toml", func(n *night) { n.plan.Settle.Watch = sweeps.Duty }, `sample.toml:21: settle.watch = "average_voltage": settling is watched by a meter; use average_voltage, motor_current`},
		{"NoScope", "sample.toml", func(n *night) {
			n.bench.Scope = nil
			n.plan.Measure.Quantities = []sweeps.Quantity{sweeps.SupplyCurrent, sweeps.Frequency}
			n.plan.Accept, n.plan.Measure.KeepWaveform = nil, 0
		}, `sample.toml:26: measure.quantities = "frequency": frequency needs a scope and bench "Pump bench" has none`},
		{"KeepWithoutScope", "sample.toml", func(n *night) {
			n.bench.Scope = nil
			n.plan.Measure.Quantities = []sweeps.Quantity{sweeps.SupplyCurrent}
			n.plan.Accept = nil
		}, `sample.toml:28: measure.keep_waveform = "every 6": bench "Pump bench" has no scope`},
		{"ScopeLooksElsewhere", "sample.toml", func(n *night) { n.bench.Scope.Channels = n.bench.Scope.Channels[:1] }, `sample.toml:26: measure.quantities = "output_drop": output_drop: no scope channel of bench "Pump bench" is wired for it; add one with between = ["load_lo", "common"]`},
		{"AcceptUnmeasured", "sample.toml", func(n *night) { n.plan.Measure.Quantities = n.plan.Measure.Quantities[1:] }, `sample.toml:36: accept.duty = "1 points": this plan does not measure it`},
		{"ChannelOnTheOutputSeesNoLoad", "sample.toml", func(n *night) { n.bench.Scope.Channels[1].Between[1] = instruments.NodeEarth }, `sample.toml:26: measure.quantities = "output_drop": output_drop: no scope channel`},
		{"NothingMeasuresSpeed", "sample.toml", func(n *night) {
			n.plan.Measure.Quantities, n.plan.Accept = []sweeps.Quantity{sweeps.PotResistance, sweeps.Speed}, nil
		}, `sample.toml:26: measure.quantities = "frequency": speed is not measured by any instrument`},
		{"TripAboveFuse", "sample.toml", func(n *night) { n.bench.Supply.Fuse = 0.85 }, `sample.toml:32: trip.supply_current.limit = "0.9 A": 900 mA is above the fuse of bench "Pump bench", 850 mA`},
		{"TripAboveProtection", "sample.toml", func(n *night) { n.plan.Trips[2].Limit = 14.5 }, `sample.toml:33: trip.supply_voltage.limit = "13 V": 14.5 V is above the over-voltage protection of bench "Pump bench", 14 V`},
		{"TooManySetpoints", "sample.toml", func(n *night) { n.plan.Axes[0].Values = manyVolts(5000); n.plan.Axes[1].Values = manyVolts(20) }, "sample.toml:8: axis: the axes make more than 100000 setpoints"},
	} {
		t.Run(c.name, func(t *testing.T) {
			n := exampleNight(t, c.plan)
			if c.name == "TooManySetpoints" {
				n.bench = nil
			}
			c.change(&n)
			err := n.check()
			if err == nil || !strings.HasPrefix(err.Error(), "example/"+c.want) || strings.Contains(err.Error(), "\n") {
				t.Errorf("got  %v\nwant example/%s", err, c.want)
			}
		})
	}
}

// wiperNight is the sample plan along the position of the bench's pot, on a board with
// both its ends in the timing network.
func wiperNight(t *testing.T) night {
	t.Helper()
	n := exampleNight(t, "overnight.toml")
	b, err := sweeps.ReadBoard("../testdata/wiper.board.toml")
	if err != nil {
		t.Fatal(err)
	}
	n.board = b
	n.plan.Axes[1].Set, n.plan.Axes[1].Values = sweeps.SetPotPosition, []float64{0.05, 0.35, 0.95}
	n.plan.WarmUp.At.Pot, n.plan.WarmUp.At.Position = si.Ohms(0), si.Ratios(0.35)
	return n
}

func TestCheckPlanOfAPosition(t *testing.T) {
	for _, c := range []struct {
		name   string
		change func(*night)
		want   string
	}{
		{"Good", func(*night) {}, ""},
		{"WithoutABench", func(n *night) { n.bench = nil }, ""},
		{"InOhms", func(n *night) { n.plan.Axes[1].Set, n.plan.Axes[1].Values = sweeps.SetPotResistance, []float64{10e3} }, `what is set is the share of its track that charges, like: set = "pot_position", values = ["20 %", "50 %", "80 %"]`},
		{"SharesAsOhms", func(n *night) { n.plan.Axes[1].Set = sweeps.SetPotResistance }, `the line would be: set = "pot_position"`},
		{"ByCode", func(n *night) { n.plan.Axes[1].Set, n.plan.Axes[1].Values = sweeps.SetPotCode, []float64{128} }, `what is set is the share of its track that charges`},
		{"BelowTheFirstStep", func(n *night) { n.plan.Axes[1].Values[0] = 0.001 }, "0.1 % of the track is out of the pot's reach, 0.391 % to 100 % (pot.codes of bench \"Pump bench\")"},
		{"TerminalVoltage", func(n *night) { n.bench.Pot.MaxTerminalVoltage = 5.5 }, "at 12 V the pot's terminals would see more than their 5.5 V"},
		{"NoAxis", func(n *night) { n.plan.Axes = n.plan.Axes[:1] }, `add one, if only with one value: set = "pot_position", values = ["35 %"]`},
		{"TurnedByHand", func(n *night) {
			n.board.Timing.Track = sweeps.Resistor{Value: si.Exactly(si.Ohms(100e3))}
			n.plan.WarmUp = nil
		}, "the pot of wiper.board.toml (timing.pot) is turned by hand, which is not supported yet"},
		{"WarmUpInOhms", func(n *night) { n.plan.WarmUp.At.Pot = si.Ohms(10e3) }, `the pot of a board with network = "wiper" (wiper.board.toml) is set by pot_position; write it like pot_position = "35 %"`},
		{"WarmUpNowhere", func(n *night) { n.plan.WarmUp.At.Position = si.Ratios(0) }, `warm_up.at.pot_position: is missing; the board is timed by the pot: say where it stands, like "35 %"`},
		{"WarmUpOutOfReach", func(n *night) { n.plan.WarmUp.At.Position = si.Ratios(0.001) }, "0.1 % of the track is out of the pot's reach"},
	} {
		t.Run(c.name, func(t *testing.T) {
			n := wiperNight(t)
			c.change(&n)
			err := n.check()
			switch {
			case c.want == "" && err != nil:
				t.Error(err)
			case c.want != "" && (err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n")):
				t.Errorf("got  %v\nwant %s", err, c.want)
			}
		})
	}
}

// Of a resistor that is the pot there is no position, in the warm-up neither.
func TestPositionOnABoardWithoutWiper(t *testing.T) {
	n := exampleNight(t, "overnight.toml")
	n.plan.Axes[1].Set, n.plan.Axes[1].Values = sweeps.SetPotPosition, []float64{0.5}
	n.plan.WarmUp.At.Position = si.Ratios(0.5)
	err := n.check()
	for _, want := range []string{`of pump-driver-b.toml one resistor is the pot: set = "pot_resistance", in ohms`, `(pump-driver-b.toml) is set by pot_resistance; write it like pot_resistance = "10k"`} {
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q is not told in\n%v", want, err)
		}
	}
}

func manyVolts(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = 7 + 5*float64(i)/float64(n)
	}
	return v
}

// A bench without the motor's ammeter: everything that would need it is told.
func TestCheckPlanTellsEverythingAMissingMeterTakesAway(t *testing.T) {
	n := exampleNight(t, "sample.toml")
	n.bench.Meters = n.bench.Meters[:1]
	err := n.check()
	var es userfile.Errors
	if !errors.As(err, &es) || len(es) != 2 || es[0].Key != "measure.quantities" || es[1].Key != "trip.motor_current" ||
		!strings.Contains(es[1].Want, `add a [[meter]] with reads = "motor_current"`) {
		t.Errorf("got %v", err)
	}
}

func TestCheckPlanOnABoardWithoutMotorOrPot(t *testing.T) {
	n := exampleNight(t, "overnight.toml")
	n.board = noPotBoard(t)
	err := n.check()
	if err == nil {
		t.Fatal("no mistake told")
	}
	for _, want := range []string{
		`axis[2].set = "pot_resistance": the board has no pot`, `warm_up.at.pot_resistance = "10k": the board has no pot`,
		"motor_current: the load of fixed-duty.board.toml is a resistor", "trip.motor_current: nothing can watch",
	} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%q is not told in\n%v", want, err)
		}
	}
}

func TestCheckPlanWithoutABench(t *testing.T) {
	n := exampleNight(t, "overnight.toml")
	n.bench = nil
	if err := n.check(); err != nil {
		t.Error(err)
	}
	n.plan.Axes[0].Values = []float64{20}
	if err := n.check(); err == nil || !strings.Contains(err.Error(), "20 V is above the highest rated supply") {
		t.Errorf("got %v", err)
	}
}

// A plan made without a file is checked all the same; its mistakes have no lines.
func TestCheckPlanWithoutAFile(t *testing.T) {
	n := exampleNight(t, "sample.toml")
	n.plan.Text, n.plan.Path = "", "made by hand"
	if err := n.check(); err != nil {
		t.Error(err)
	}
	n.plan.Axes[0].Values = nil
	if err := n.check(); err == nil || err.Error() != "made by hand: axis[1].values: the list is empty; give at least one" {
		t.Errorf("got %v", err)
	}
}

// Stage none: the timer's output is the load's terminal, so a channel on it sees the drop.
func TestTimerOutputIsTheLoadWithoutAStage(t *testing.T) {
	n := exampleNight(t, "sample.toml")
	b, err := sweeps.ReadBoard("example/pump-driver-a.toml")
	if err != nil {
		t.Fatal(err)
	}
	n.board = b
	n.plan.Measure.Quantities = []sweeps.Quantity{sweeps.OutputDrop}
	n.plan.Trips, n.plan.Accept = nil, nil
	n.bench.Scope.Channels = n.bench.Scope.Channels[:1]
	if err := n.check(); err != nil {
		t.Error(err)
	}
}
