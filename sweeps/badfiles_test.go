package sweeps_test

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightbench/instruments/bench"
	"nightbench/instruments/userfile"
	"nightbench/sweeps"
)

// bad says what is told about one file of testdata/bad: its one mistake.
type bad struct {
	line  int
	key   string
	found string
	want  string // begins with
	fix   string
}

// badFiles are all files of testdata/bad, each named for its mistake.
var badFiles = map[string]bad{
	"accept-in-wrong-unit.plan.toml":          {31, "accept.duty", `"0.1 V"`, "duty is in percentage points (a ratio), the limit in V", ""},
	"accuracy-without-unit.bench.toml":        {17, "meter[1].accuracy.reading", `"0.05"`, "has no unit; write it in % or ppm", `reading = "0.05 %"`},
	"ambient-without-unit.plan.toml":          {5, "plan.ambient", `"22"`, `"22" has no unit; write a temperature like "27 degC"`, `ambient = "22 degC"`},
	"axis-nobody-can-set.plan.toml":           {11, "axis[2].set", `"fan_speed"`, "nothing on a bench sets that; use supply_voltage, pot_resistance, pot_code or pot_position", ""},
	"axis-not-yet.plan.toml":                  {11, "axis[2].set", `"timer_output"`, "not supported yet by this version; use supply_voltage, pot_resistance, pot_code or pot_position", ""},
	"board-file-not-found.plan.toml":          {3, "plan.board", `"../../sweeps/example/pump-driver-c.toml"`, "no such file: ../sweeps/example/pump-driver-c.toml; the path counts from the plan's folder; in that folder are: bench.toml", ""},
	"byte-order-mark.board.toml":              {1, "", "", "begins with a byte order mark; save it as UTF-8 without one", ""},
	"densify-not-yet.plan.toml":               {33, "densify", "", "not supported yet by this version; leave it out, and give the axis more points", ""},
	"empty-list.plan.toml":                    {8, "axis[1].values", "[]", "the list is empty; give at least one", ""},
	"empty.plan.toml":                         {0, "", "", "is empty; write a first one with: nightbench new DIR --example", ""},
	"falling-values.plan.toml":                {8, "axis[1].values", `"9 V"`, "is not above the one before it", ""},
	"hand-turned-pot-not-yet.bench.toml":      {27, "pot.address", `"manual"`, "a person reading or turning it is not supported yet by this version", ""},
	"key-of-another-network.board.toml":       {14, "timing.common", `"1k"`, `network "steered" has no use for it here; it uses charge, discharge`, ""},
	"key-twice.board.toml":                    {14, "timing.charge", `"12k 1%"`, "already given on line 11; keep one of the two", ""},
	"limit-above-rating.plan.toml":            {8, "axis[1].values", `"12.5 V"`, "12.5 V is above the highest rated supply of the board, 12 V (board.rated_supply in pump-driver-b.toml)", ""},
	"missing-unit.bench.toml":                 {6, "supply.max_voltage", `"13"`, `"13" has no unit; write a voltage like "9 V"`, `max_voltage = "13 V"`},
	"missing-unit.plan.toml":                  {8, "axis[1].values", `"12"`, `"12" has no unit; write a voltage like "9 V"`, `values = ["9 V", "12 V"]`},
	"motor-without-flyback.board.toml":        {18, "driver.flyback", "", `is missing; a motor needs a flyback diode like "1N5819", or say that it has "none"`, ""},
	"negative-resistance.board.toml":          {11, "timing.charge", `"-10k 1%"`, "a resistance has to be above zero", ""},
	"no-meter-for-it.plan.toml":               {24, "measure.quantities", `"control_voltage"`, `control_voltage: no meter of bench "Pump bench" reads it; add a [[meter]] with reads = "control_voltage" to the bench file`, ""},
	"no-supply.bench.toml":                    {1, "supply", "", "the table [supply] is missing", ""},
	"not-utf8.bench.toml":                     {2, "", "", "byte 0xe4 is not UTF-8; save the file as UTF-8", ""},
	"one-repeat.plan.toml":                    {25, "measure.repeats", "1", "give a whole number from 2 to 1000", ""},
	"over-voltage-below-limit.bench.toml":     {8, "supply.over_voltage", `"12 V"`, "has to be above max_voltage, 13 V", `over_voltage = "14 V"`},
	"pace-on-a-real-bench.bench.toml":         {3, "bench.pace", "20", "only a practice bench can be sped up", ""},
	"park-beyond-the-last-code.bench.toml":    {33, "pot.park", "257", "the codes of this pot are 0 to 256", "park = 256"},
	"pot-axis-on-fixed-board.plan.toml":       {11, "axis[2].set", `"pot_resistance"`, "the board has no pot: no resistor in [timing] of fixed-duty.board.toml", ""},
	"pot-out-of-reach.plan.toml":              {13, "axis[2].to", `"150k"`, "150 kΩ is out of the pot's reach, 75 Ω to 100.08 kΩ", ""},
	"pot-position-without-wiper.plan.toml":    {11, "axis[2].set", `"pot_position"`, `a position is set on boards with network = "wiper"`, ""},
	"pot-resistance-on-wiper-board.plan.toml": {11, "axis[2].set", `"pot_resistance"`, "both ends of the pot are in the timing network", `set = "pot_position"`},
	"pot-table-not-yet.bench.toml":            {30, "pot.calibration", `"pot-7.csv"`, "not supported yet by this version; give end_to_end", ""},
	"recheck-not-yet.plan.toml":               {33, "recheck", "", "not supported yet by this version; leave it out", ""},
	"resistor-with-inertia.board.toml":        {26, "load.inertia", `"5 g cm2"`, `a load of kind "resistor" has no use for it`, ""},
	"same-axis-twice.plan.toml":               {11, "axis[2].set", `"supply_voltage"`, "axis 1 (line 6) sets supply_voltage already", ""},
	"seek-not-yet.plan.toml":                  {33, "seek", "", "not supported yet by this version; leave it out", ""},
	"static-below-coulomb.board.toml":         {28, "load.static_torque", `"0.3 mN m"`, "can't be below the coulomb torque", ""},
	"text-without-quotes.board.toml":          {14, "timing.capacitor", "22n 5%", "text and quantities stand in quotes", `capacitor = "22n 5%"`},
	"trigger-above-threshold.board.toml":      {9, "timer.trigger", "0.6", "has to be below the threshold, 0.5", ""},
	"trip-above-bench-limit.plan.toml":        {28, "trip.motor_current.limit", `"1.5 A"`, `1.5 A is above what bench "Pump bench" allows, 1 A (supply.max_current)`, ""},
	"trip-at-once.plan.toml":                  {28, "trip.supply_voltage.limit", `"12 V"`, "12 V is not above the plan's highest supply, 12 V", ""},
	"two-instruments-one-port.bench.toml":     {20, "scope.address", `"tcp://192.0.2.11:05025"`, "is the same port as meter[1].address (line 14)", ""},
	"two-nodes-on-earth.bench.toml":           {26, "scope.channel.2.between", `["load_hi", "load_lo"]`, "scope.channel.2 on load_lo and scope.channel.1 on common (line 23) are both earthed", ""},
	"two-pots.board.toml":                     {12, "timing.discharge", `"pot"`, "timing.charge is the bench's pot already", ""},
	"unknown-dialect.bench.toml":              {21, "scope.dialect", `"standard-skope"`, "no such dialect; use auto, ", `dialect = "standard-scope"`},
	"unknown-key.bench.toml":                  {7, "supply.max_curent", `"1 A"`, `unknown key; did you mean "max_current"? (accepted here: address, between`, `max_current = "1 A"`},
	"unknown-kind-of-address.bench.toml":      {20, "scope.address", `"http://192.0.2.12:5025"`, `address "http://192.0.2.12:5025": unknown kind of address; use serial://`, ""},
	"unknown-network.board.toml":              {10, "timing.network", `"steerd"`, "use plain, bypassed, steered, wiper or output-fed", `network = "steered"`},
	"unknown-node.bench.toml":                 {16, "meter[1].between", `"load_high"`, `"load_high" is no node; nodes are: supply, board`, `between = ["load_hi", "load_lo"]`},
	"unknown-quantity.plan.toml":              {24, "measure.quantities", `"frequence"`, `"frequence" is no quantity; there are: duty, frequency`, `quantities = ["duty", "frequency", "average_voltage"]`},
	"vxi11-not-yet.bench.toml":                {20, "scope.address", `"vxi11://192.0.2.12"`, "vxi11 is not supported yet by this version; use serial://", ""},
	"wrong-unit.bench.toml":                   {7, "supply.max_current", `"1 V"`, `"1 V" has an unknown unit "V" for a current; write it like "250 mA"`, ""},
}

const badFolder = "../testdata/bad"

// readAny reads a file of testdata/bad by the kind in its name; plans are checked against the example bench.
func readAny(t *testing.T, path string) error {
	t.Helper()
	switch {
	case strings.HasSuffix(path, ".bench.toml"):
		_, err := bench.Read(path)
		return err
	case strings.HasSuffix(path, ".board.toml"):
		_, err := sweeps.ReadBoard(path)
		return err
	case strings.HasSuffix(path, ".plan.toml"):
		plan, board, err := sweeps.ReadPlan(path)
		if err != nil {
			return err
		}
		b, err := bench.Read("example/bench.toml")
		if err != nil {
			t.Fatal(err)
		}
		return sweeps.CheckPlan(plan, board, &b.Wiring)
	}
	t.Fatalf("%s: a bad file's name ends in .bench.toml, .board.toml or .plan.toml", path)
	return nil
}

func TestEveryBadFileIsTold(t *testing.T) {
	for name, want := range badFiles {
		t.Run(name, func(t *testing.T) {
			path := filepath.Join(badFolder, name)
			err := readAny(t, path)
			var e *userfile.Error
			if !errors.As(err, &e) {
				t.Fatalf("got %v, want a mistake in the file", err)
			}
			if strings.Contains(err.Error(), "\n") {
				t.Errorf("more than one mistake is told:\n%v", err)
			}
			got := bad{e.Line, e.Key, e.Found, e.Want, e.Fix}
			if strings.HasPrefix(got.want, want.want) {
				got.want = want.want
			}
			if e.File != path || got != want {
				t.Errorf("file %s\ngot  %+v\nwant %+v", e.File, got, want)
			}
		})
	}
}

func TestNoBadFileIsUntested(t *testing.T) {
	entries, err := os.ReadDir(badFolder)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if _, ok := badFiles[e.Name()]; !ok {
			t.Errorf("%s is in testdata/bad and not in the table", e.Name())
		}
	}
	if len(entries) < 16 {
		t.Errorf("%d files, want 16 or more", len(entries))
	}
}

// A corrected line is a promise: put in its place, the file has no mistake left.
func TestCorrectedLinesAreRight(t *testing.T) {
	example, err := filepath.Abs("example")
	if err != nil {
		t.Fatal(err)
	}
	for name, b := range badFiles {
		if b.fix == "" {
			continue
		}
		t.Run(name, func(t *testing.T) {
			text, err := os.ReadFile(filepath.Join(badFolder, name))
			if err != nil {
				t.Fatal(err)
			}
			lines := strings.Split(string(text), "\n")
			key := b.key[strings.LastIndex(b.key, ".")+1:]
			lines[b.line-1] = strings.Replace(lines[b.line-1], key+" = "+wholeValue(lines[b.line-1], key, b.found), b.fix, 1)
			fixed := strings.ReplaceAll(strings.Join(lines, "\n"), "../../sweeps/example", example)
			fixed = strings.ReplaceAll(fixed, `"../wiper`, `"`+filepath.Dir(filepath.Dir(example))+"/testdata/wiper")
			path := filepath.Join(t.TempDir(), name)
			if err := os.WriteFile(path, []byte(fixed), 0o644); err != nil {
				t.Fatal(err)
			}
			if err := readAny(t, path); err != nil {
				t.Errorf("with %s: %v", b.fix, err)
			}
		})
	}
}

// wholeValue is the value as it stands behind a key: of a list what was found may be one element only.
func wholeValue(line, key, found string) string {
	_, value, _ := strings.Cut(line, key+" = ")
	if strings.HasPrefix(value, "[") {
		return value
	}
	return found
}
