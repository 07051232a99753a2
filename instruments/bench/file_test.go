package bench

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightbench/instruments"

	"github.com/google/go-cmp/cmp"
)

// written writes a bench file of its own.
func written(t *testing.T, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "bench.toml")
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

const head = "[bench]\nname = \"Bench 2\"\n"

const supply = `[supply]
address = "serial:///dev/ttyS7?baud=9600"
max_voltage = "13 V"
max_current = "1 A"
over_voltage = "14 V"
between = ["supply", "common"]
`

const everything = head + `
[supply]
address = "tcp://192.0.2.10:5025"
dialect = "standard-supply"
channel = 2
max_voltage = "13 V"
max_current = "1 A"
over_voltage = "14 V"
fuse = "1 A"
between = ["supply", "common"]
[[meter]]
name = "average"
address = "tcp://192.0.2.11:5025"
reads = "average_voltage"
between = ["load_hi", "load_lo"]
input_resistance = "10M"
accuracy = { reading = "0.012 %", range = "40 ppm", offset = "1 mV", resolution = "10 uV" }
calibrated = "2026-03-01"
due = 2027-03-01
[[meter]]
name = "motor"
address = "serial:///dev/ttyS8"
dialect = "auto"
reads = "motor_current"
between = ["flyback_top", "load_hi"]
burden = "0.3"
accuracy = { reading = "1 %" }
[scope]
address = "tcp://192.0.2.12:5025"
earthed = true
[scope.channel.2]
between = ["load_lo", "common"]
probe = 1
[scope.channel.1]
between = ["timer_out", "common"]
probe = 10
[pot]
address = "serial:///dev/ttyS9?baud=115200"
codes = 257
end_to_end = "100k 20%"
wiper = "75"
max_terminal_voltage = "16 V"
max_current = "2.5 mA"
park = 256
earthed = true
`

func TestReadReadsEveryKey(t *testing.T) {
	f, err := Read(written(t, everything))
	if err != nil {
		t.Fatal(err)
	}
	want := instruments.Wiring{
		Bench:  "Bench 2",
		Supply: instruments.SupplyWiring{Between: instruments.Between{"supply", "common"}, MaxVoltage: 13, MaxCurrent: 1, OverVoltage: 14, Fuse: 1},
		Meters: []instruments.MeterWiring{
			{Name: "average", Reads: "average_voltage", Between: instruments.Between{"load_hi", "load_lo"}, InputResistance: 10e6, Calibrated: "2026-03-01", Due: "2027-03-01",
				Accuracy: &instruments.Accuracy{Reading: 0.012 / 100, Range: 40e-6, Offset: 1e-3, Resolution: 10e-6}},
			{Name: "motor", Reads: "motor_current", Between: instruments.Between{"flyback_top", "load_hi"}, Burden: 0.3, Accuracy: &instruments.Accuracy{Reading: 0.01}},
		},
		Scope: &instruments.ScopeWiring{Earthed: true, Channels: []instruments.ScopeChannelWiring{
			{Number: 1, Between: instruments.Between{"timer_out", "common"}, Probe: 10}, {Number: 2, Between: instruments.Between{"load_lo", "common"}, Probe: 1}}},
		Pot: &instruments.PotWiring{Codes: 257, EndToEnd: 100e3, Tolerance: 0.2, Wiper: 75, MaxTerminalVoltage: 16, MaxCurrent: 2.5e-3, Park: 256},
	}
	near := cmp.Comparer(func(a, b float64) bool { return a == b || (a-b)*(a-b) < 1e-18*a*a })
	if d := cmp.Diff(want, f.Wiring, near); d != "" {
		t.Error(d)
	}
	if f.Supply.Address.String() != "tcp://192.0.2.10:5025" || f.Supply.Dialect != "standard-supply" || f.Supply.Channel != 2 {
		t.Errorf("supply: %+v", f.Supply)
	}
	if len(f.Meters) != 2 || f.Meters[0].Dialect != Auto || f.Meters[1].Dialect != Auto || f.Meters[1].Address.Path != "/dev/ttyS8" {
		t.Errorf("meters: %+v", f.Meters)
	}
	if f.Scope == nil || f.Pot == nil || f.Pot.Address.Line.Baud != 115200 || f.Cutoff != nil || f.Pace != 1 || f.Text != everything {
		t.Errorf("file: %+v", f)
	}
}

func TestOnlyTheSupplyIsNeeded(t *testing.T) {
	f, err := Read(written(t, "[bench]\nname = \"Small\"\npractice = true\npace = 20\n"+supply))
	if err != nil {
		t.Fatal(err)
	}
	w := f.Wiring
	if w.Scope != nil || w.Pot != nil || w.Meters != nil || f.Scope != nil || f.Pot != nil || !w.Practice || f.Pace != 20 || w.Supply.Fuse != 0 || f.Supply.Channel != 1 {
		t.Errorf("%+v", f)
	}
}

// Two spellings of one device, by the link that udev makes, are one port.
func TestOnePortByTwoNames(t *testing.T) {
	dir := t.TempDir()
	device, byID := filepath.Join(dir, "ttyUSB0"), filepath.Join(dir, "usb-SUPPLY")
	if err := os.WriteFile(device, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(device, byID); err != nil {
		t.Fatal(err)
	}
	text := head + strings.Replace(supply, "/dev/ttyS7", byID, 1) +
		"[[meter]]\nname = \"a\"\naddress = \"serial://" + device + "?baud=115200\"\nreads = \"average_voltage\"\nbetween = [\"load_hi\", \"load_lo\"]\n"
	if _, err := Read(written(t, text)); err == nil || !strings.Contains(err.Error(), "is the same port as supply.address (line 4)") {
		t.Errorf("got %v", err)
	}
}

// One mistake each: replace the first text by the second in the whole file.
func TestBenchMistakes(t *testing.T) {
	for _, c := range []struct{ name, old, new, want string }{
		{"PaceTooFast", "name = \"Bench 2\"", "name = \"x\"\npractice = true\npace = 1e6", "bench.pace = 1e6: give how many times as fast"},
		{"PaceAsText", "name = \"Bench 2\"", "name = \"x\"\npractice = true\npace = \"20\"", "bench.pace = \"20\": give a number without quotes"},
		{"NoName", "name = \"Bench 2\"", "", "bench.name: is missing"},
		{"NegativeLimit", `max_voltage = "13 V"`, `max_voltage = "-13 V"`, `supply.max_voltage = "-13 V": has to be above zero`},
		{"FuseTooSmall", `fuse = "1 A"`, `fuse = "500 mA"`, `supply.fuse = "500 mA": is below max_current, 1 A`},
		{"Channel", "channel = 2", "channel = 0", "supply.channel = 0: give a whole number from 1 to 8"},
		{"Sense", "channel = 2", "sense = \"remote\"", "supply.sense = \"remote\": not supported yet by this version; leave it out"},
		{"OneNode", `["supply", "common"]`, `["supply"]`, `supply.between = ["supply"]: give two nodes`},
		{"SameNode", `["supply", "common"]`, `["common", "common"]`, `supply.between = ["common", "common"]: is "common" twice`},
		{"ReadsMisspelt", `"motor_current"`, `"motor_curent"`, `meter[2].reads = "motor_curent": use average_voltage, motor_current, output_current or control_voltage; nothing else is supported yet by this version; the line would be: reads = "motor_current"`},
		{"ReadsTwice", `"motor_current"`, `"average_voltage"`, `meter[2].reads = "average_voltage": meter "average" reads average_voltage already`},
		{"NameTwice", `"motor"`, `"average"`, `meter[2].name = "average": another meter has this name`},
		{"BurdenOfVoltmeter", `input_resistance = "10M"`, `burden = "1"`, `meter[1].burden = "1": only a meter that reads a current has one`},
		{"InputOfAmmeter", `burden = "0.3"`, `input_resistance = "10M"`, `meter[2].input_resistance = "10M": only a meter that reads a voltage has one`},
		{"Exact", `{ reading = "1 %" }`, `{ reading = "0 %" }`, `meter[2].accuracy: no instrument is exact`},
		{"AccuracyNumber", `{ reading = "1 %" }`, `{ reading = 0.01 }`, `meter[2].accuracy.reading = 0.01: has no unit; write it in % or ppm`},
		{"AccuracyInVolts", `offset = "1 mV"`, `offset = "1 mA"`, `meter[1].accuracy.offset = "1 mA": "1 mA" has an unknown unit`},
		{"AccuracyOverOne", `{ reading = "1 %" }`, `{ reading = "100 %" }`, `meter[2].accuracy.reading = "100 %": has to be below 100 %`},
		{"DueBeforeCalibrated", "due = 2027-03-01", "due = 2025-03-01", "meter[1].due = 2025-03-01: has to be after the date of calibration, 2026-03-01"},
		{"NoDate", `calibrated = "2026-03-01"`, `calibrated = "March"`, `meter[1].calibrated = "March": give a date`},
		{"Filter", `burden = "0.3"`, `filter = "1 s"`, `meter[2].filter = "1 s": not supported yet by this version; leave it out`},
		{"EarthNotSaid", "earthed = true\n[scope.channel.2]", "[scope.channel.2]", "scope.earthed: is missing"},
		{"NoChannel", everything[strings.Index(everything, "[scope.channel.2]"):strings.Index(everything, "[pot]")], "", "scope.channel: the table [scope.channel] is missing"},
		{"ChannelName", "[scope.channel.2]", "[scope.channel.a]", "scope.channel.a: a channel's name is its number"},
		{"Probe", "probe = 10\n", "probe = 0\n", "scope.channel.1.probe = 0: give the probe's attenuation"},
		{"EarthedPotAndClip", `between = ["timer_out", "common"]`, `between = ["timer_out", "load_lo"]`, `scope.channel.1.between = ["timer_out", "load_lo"]: scope.channel.1 on load_lo and scope.channel.2 on common`},
		{"EarthedMeter", `burden = "0.3"`, "burden = 1\nearthed = true", `on common`},
		{"PotNormal", `"100k 20%"`, `"100k 20% normal"`, `pot.end_to_end = "100k 20% normal": a normal distribution is not supported yet here`},
		{"PotOneCode", "codes = 257", "codes = 1", "pot.codes = 1: give a whole number from 2 to 65537"},
		{"SerialRelative", "serial:///dev/ttyS8", "serial://ttyS8", `meter[2].address = "serial://ttyS8": address "serial://ttyS8": a serial address needs the whole path`},
		{"ManualMeter", "serial:///dev/ttyS8", "manual", `meter[2].address = "manual": a person reading or turning it is not supported yet`},
		{"UnknownTable", "[pot]", "[pots]", `pots: unknown table; did you mean "pot"?`},
		{"MeterTable", "[[meter]]\nname = \"average\"", "[meter]\nname = \"average\"", "meter: already given on line"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if !strings.Contains(everything, c.old) {
				t.Fatalf("%q is not in the file", c.old)
			}
			path := written(t, strings.Replace(everything, c.old, c.new, 1))
			_, err := Read(path)
			if err == nil || !strings.Contains(err.Error(), c.want) || !strings.HasPrefix(err.Error(), path+":") || strings.Contains(err.Error(), "\n") {
				t.Errorf("got  %v\nwant %s", err, c.want)
			}
		})
	}
}

// The two circuits that short a board through earth, as bench practice tells them.
func TestOneEarth(t *testing.T) {
	clip := head + supply + "[scope]\naddress = \"tcp://192.0.2.12:5025\"\nearthed = %s\n[scope.channel.1]\nbetween = [\"load_hi\", \"load_lo\"]\nprobe = 10\n" +
		"[pot]\naddress = \"serial:///dev/ttyS9\"\ncodes = 257\nend_to_end = \"100k\"\nwiper = 75\nmax_terminal_voltage = \"16 V\"\nmax_current = \"2.5 mA\"\npark = 0\nearthed = true\n"
	_, err := Read(written(t, strings.Replace(clip, "%s", "true", 1)))
	if err == nil || !strings.Contains(err.Error(), "pot.earthed = true: pot on common and scope.channel.1 on load_lo (line 13) are both earthed: together they short out whatever lies between") {
		t.Errorf("got %v", err)
	}
	if _, err := Read(written(t, strings.Replace(clip, "%s", "false", 1))); err != nil {
		t.Errorf("a scope that floats: %v", err)
	}
}
