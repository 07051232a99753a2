package dialect

import (
	"errors"
	"maps"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"nightbench/instruments"
	"nightbench/instruments/userfile"
)

func TestOursCanBeRead(t *testing.T) {
	all, err := All()
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, d := range all {
		names = append(names, d.Head.Name)
		if d.Head.About == "" || len(d.Identities) == 0 || len(d.Hash) != 64 {
			t.Errorf("%s: about %q, %d identities, hash %q", d.Head.Name, d.Head.About, len(d.Identities), d.Hash)
		}
	}
	for role, least := range map[Role]int{RoleSupply: 6, RoleMeter: 6, RoleScope: 6, RolePot: 1} {
		if got := len(Names(role)); got < least {
			t.Errorf("%d dialects for a %s: %v", got, role, names)
		}
	}
}

func mustFind(t *testing.T, role Role, name string) *Dialect {
	t.Helper()
	d, err := Find(role, name)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// The nodes that SCPI gives these jobs (the makers' manuals named in the files
// restate them): a slip of the pen in a data file shows here.
func TestNodesOfTheStandardDialects(t *testing.T) {
	for _, c := range []struct {
		role        Role
		name, line  string
		sends, asks string
	}{
		{RoleSupply, "standard-supply", "off", "OUTP OFF", ""},
		{RoleSupply, "standard-supply", "on", "OUTP ON", ""},
		{RoleSupply, "standard-supply", "voltage", "VOLT 9", "VOLT?"},
		{RoleSupply, "standard-supply", "current_limit", "CURR 9", "CURR?"},
		{RoleSupply, "standard-supply", "over_voltage", "VOLT:PROT 9", "VOLT:PROT?"},
		{RoleSupply, "standard-supply", "over_voltage_tripped", "", "VOLT:PROT:TRIP?"},
		{RoleSupply, "standard-supply", "measure_current", "", "MEAS:CURR?"},
		{RoleSupply, "standard-supply", "limiting", "", "STAT:QUES:COND?"},
		{RoleMeter, "standard-meter", "voltage_function", `FUNC "VOLT:DC"`, "FUNC?"},
		{RoleMeter, "standard-meter", "current_range", "CURR:DC:RANG 9", "CURR:DC:RANG?"},
		{RoleMeter, "standard-meter", "read", "", "READ?"},
		{RoleScope, "standard-scope", "duration", "SENS:SWE:TIME 9", "SENS:SWE:TIME?"},
		{RoleScope, "standard-scope", "range_high", "SENS2:VOLT:RANG:UPP 9", "SENS2:VOLT:RANG:UPP?"},
		{RoleScope, "standard-scope", "scaling", "", "TRAC:PRE? CH2"},
		{RolePot, "nightbench-pot", "code", "WIP 9", "WIP?"},
	} {
		l, err := mustFind(t, c.role, c.name).Line(c.line)
		if err != nil {
			t.Error(err)
			continue
		}
		p := Put{Value: 9, Channel: 2}
		if p.Fill(l.Send) != c.sends || p.Fill(l.Ask) != c.asks {
			t.Errorf("%s of %s: %q and %q", c.line, c.name, p.Fill(l.Send), p.Fill(l.Ask))
		}
	}
}

// Limits at full scale as the maker's calibration guide prints them (HP 34401A,
// chapter 4, page 69), against what the figures give.
func TestMeterFiguresGiveTheCalibrationLimits(t *testing.T) {
	d := mustFind(t, RoleMeter, "standard-meter")
	for _, c := range []struct {
		of       string
		range_   float64
		at, want float64
	}{
		{"voltage", 0.1, 0.1, 8.5e-6},
		{"voltage", 1, 1, 47e-6},
		{"voltage", 10, 10, 400e-6},
		{"voltage", 100, 100, 5.1e-3},
		{"voltage", 1000, 1000, 55e-3},
		{"current", 0.01, 0.01, 7e-6},
		{"current", 0.1, 0.1, 55e-6},
		{"current", 1, 1, 1.1e-3},
		{"current", 3, 2, 3.0e-3},
	} {
		f, ok := d.Figure(c.of, c.range_, 1)
		if !ok || f.Range != c.range_ {
			t.Errorf("%s on %g: found %+v", c.of, c.range_, f)
			continue
		}
		if got := f.Accuracy.Limit(c.at, f.Range); math.Abs(got-c.want) > 1e-3*c.want {
			t.Errorf("%s on %g: limit %g, the guide prints %g", c.of, c.range_, got, c.want)
		}
	}
}

func TestFigure(t *testing.T) {
	d := mustFind(t, RoleMeter, "standard-meter")
	if f, ok := d.Figure("voltage", 10.8, 1); !ok || f.Range != 100 || f.Highest != 120 {
		t.Errorf("for 10.8 V: %+v", f)
	}
	if f, ok := d.Figure("current", 5, 1); ok {
		t.Errorf("for 5 A: %+v", f)
	}
}

func TestEveryCommandLineHasASource(t *testing.T) {
	all, err := All()
	if err != nil {
		t.Fatal(err)
	}
	for _, d := range all {
		for name, l := range d.Commands {
			if _, known := d.Sources[l.Source]; !known && l.Source != "ours" && l.Source != "unchecked" {
				t.Errorf("%s: %s has the source %q", d.Head.Name, name, l.Source)
			}
		}
	}
	if got := mustFind(t, RoleMeter, "standard-meter").Unchecked(); !slices.Equal(got, []string{"current_speed", "voltage_speed"}) {
		t.Errorf("from memory: %v", got)
	}
	if got := mustFind(t, RoleSupply, "standard-supply").Unchecked(); len(got) != 0 {
		t.Errorf("a supply's lines have to be checked: %v", got)
	}
}

func TestLineThatIsNotThere(t *testing.T) {
	d := mustFind(t, RoleSupply, "standard-supply")
	_, err := d.Line("over_voltage_arm")
	if !errors.Is(err, ErrCannot) || !strings.Contains(err.Error(), "arm its over-voltage protection") {
		t.Errorf("got %v", err)
	}
}

func TestNumberIsPlain(t *testing.T) {
	for x, want := range map[float64]string{
		0: "0", 5: "5", 0.005: "0.005", 9.1: "9.1", 0.1 + 0.2: "0.3", 1e6: "1000000", -2.5: "-2.5", 1e-9: "0.000000001", 12.345678912: "12.3456789",
	} {
		if got := Number(x); got != want {
			t.Errorf("%v: got %q, want %q", x, got, want)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.Float64Range(-1e9, 1e9).Draw(t, "x")
		s := Number(x)
		if strings.ContainsAny(s, "eE") {
			t.Fatalf("%v: %q has an exponent", x, s)
		}
		back := parseFloat(t, s)
		if math.Abs(back-x) > 1e-8*math.Abs(x)+1e-18 {
			t.Fatalf("%v became %q", x, s)
		}
	})
}

func TestAgrees(t *testing.T) {
	for _, c := range []struct {
		name         string
		line         Line
		asked, found float64
		want         bool
	}{
		{"Exactly", Line{}, 5, 5, true},
		{"RoundedToAStep", Line{Step: 1e-3}, 5.00049, 5, true},
		{"MoreThanAStep", Line{Step: 1e-3}, 5.002, 5, false},
		{"WithinAShare", Line{Within: 0.01}, 100, 99.1, true},
		{"OutsideAShare", Line{Within: 0.01}, 100, 98.9, false},
		{"RangeOfTwoBecomesTen", Line{Step: 1e-3}, 2, 10, false}, // GDM-8261A, page 163
		{"Zero", Line{}, 0, 0, true},
		{"NotANumber", Line{Step: 1}, 1, math.NaN(), false},
	} {
		if got := c.line.Agrees(c.asked, c.found); got != c.want {
			t.Errorf("%s: got %v", c.name, got)
		}
	}
}

// Identities as makers' manuals print them.
func TestPatterns(t *testing.T) {
	for _, c := range []struct {
		name    string
		pattern Pattern
		id      instruments.Identity
		want    bool
	}{
		{"AnyModelOfAMaker", Pattern{Maker: "HEWLETT-PACKARD", Model: "E36*"}, instruments.Identity{Maker: "HEWLETT-PACKARD", Model: "E3632A"}, true},
		{"CaseDoesNotMatter", Pattern{Maker: "rigol technologies", Model: "ds1*"}, instruments.Identity{Maker: "RIGOL TECHNOLOGIES", Model: "DS1054Z"}, true},
		{"BlanksDoNotMatter", Pattern{Maker: "KEITHLEY INSTRUMENTS INC.", Model: "MODEL 2000"}, instruments.Identity{Maker: "KEITHLEY INSTRUMENTS INC.", Model: " MODEL 2000"}, true},
		{"AnotherModel", Pattern{Maker: "HEWLETT-PACKARD", Model: "34401A"}, instruments.Identity{Maker: "HEWLETT-PACKARD", Model: "E3632A"}, false},
		{"FreeText", Pattern{Text: "KORAD KC3405*"}, instruments.Identity{Raw: "KORAD KC3405 V1.0 SN:01234567"}, true},
		{"StarTakesASlash", Pattern{Maker: "*", Model: "E4*"}, instruments.Identity{Maker: "R/S", Model: "E4/2"}, true},
	} {
		if got := c.pattern.Matches(c.id); got != c.want {
			t.Errorf("%s: got %v", c.name, got)
		}
	}
}

func TestFind(t *testing.T) {
	if _, err := Find(RoleSupply, "standart-supply"); !errors.Is(err, ErrUnknown) || !strings.Contains(err.Error(), `did you mean "standard-supply"`) {
		t.Errorf("got %v", err)
	}
	if _, err := Find(RoleMeter, "standard-supply"); err == nil || !strings.Contains(err.Error(), "standard-meter") {
		t.Errorf("a supply's dialect for a meter: %v", err)
	}
	own := filepath.Join(t.TempDir(), "own.toml")
	text := strings.Replace(mustFind(t, RolePot, "nightbench-pot").Text, `"nightbench-pot"`, `"own-pot"`, 1)
	if err := os.WriteFile(own, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	if d := mustFind(t, RolePot, own); d.Head.Name != "own-pot" {
		t.Errorf("read %+v", d.Head)
	}
	if _, err := Find(RolePot, own+".toml"); err == nil {
		t.Error("a file that is not there was read")
	}
}

// Every mistake is told with its line, its key, and what would do.
func TestMistakes(t *testing.T) {
	supply := mustFind(t, RoleSupply, "standard-supply").Text
	meter := mustFind(t, RoleMeter, "standard-meter").Text
	scope := mustFind(t, RoleScope, "standard-scope").Text
	for name, c := range map[string]struct {
		text, old, new string
		key, says      string
	}{
		"LineWithoutSource":    {supply, `on = { send = "OUTP ON", source = "S7" }`, `on = { send = "OUTP ON" }`, "command.on.source", "missing"},
		"UnknownSource":        {supply, `on = { send = "OUTP ON", source = "S7" }`, `on = { send = "OUTP ON", source = "S99" }`, "command.on.source", "unchecked"},
		"UnknownLine":          {supply, "limiting =", "limitting =", "command.limitting", `"limiting"`},
		"OutputOffMissing":     {supply, "\noff = ", "\n# off = ", "command.off", "missing"},
		"SettingNotReadBack":   {supply, `ask = "VOLT?", `, "", "command.voltage", "read back"},
		"NoPlaceForTheValue":   {supply, "VOLT {value}", "VOLT 5", "command.voltage.send", "{value}"},
		"UnknownPlaceholder":   {supply, "VOLT {value}", "VOLT {volts}", "command.voltage.send", "{volts}"},
		"OpenBrace":            {supply, "VOLT {value}", "VOLT {value", "command.voltage.send", "without its }"},
		"StepWithoutUnit":      {supply, `step = "1 mV"`, `step = "1"`, "command.voltage.step", "unit"},
		"StepOfAnotherUnit":    {supply, `step = "1 mV"`, `step = "1 mA"`, "command.voltage.step", "voltage"},
		"UnknownReply":         {supply, `reply = "bool"`, `reply = "boolean"`, "command.output.reply", "bool"},
		"TwoLinesInOne":        {supply, `send = "OUTP ON"`, `send = "OUTP ON\nVOLT 5"`, "command.on.send", "one line"},
		"UnknownRole":          {supply, `role = "supply"`, `role = "source"`, "dialect.role", "supply"},
		"NoAccuracy":           {supply, `of = "measure_current"`, `of = "measure_voltage"`, "", "measure_current"},
		"AccuracyOfNothing":    {supply, "reading = \"0.05 %\"\noffset = \"5 mV\"\n", "", "accuracy[1]", "no limit of error"},
		"NoErrorQueueSaid":     {supply, `form = "queue"`, `forms = "queue"`, "errors.forms", "form"},
		"SpeedsOutOfOrder":     {meter, "nplc = 0.2", "nplc = 200", "speed[3]", "in order"},
		"SpeedBelowZero":       {meter, "nplc = 0.02", "nplc = -1", "speed[1]", "above 0"},
		"FunctionWithoutRange": {meter, "\nvoltage_range", "\n#voltage_range", "command", "belong together"},
		"HighestBelowRange":    {meter, `highest = "120 mV"`, `highest = "90 mV"`, "accuracy[1].highest", "below the range"},
		"ClipCodesCrossed":     {scope, "clip_high = 127", "clip_high = -128", "waveform.clip_high", "above"},
		"UnknownScaling":       {scope, `family = "code-linear"`, `family = "counts"`, "waveform.family", "code-linear"},
		"TagWithAMeaning":      {scope, "S7 = ", "ours = ", "sources.ours", "another tag"},
	} {
		t.Run(name, func(t *testing.T) {
			if !strings.Contains(c.text, c.old) {
				t.Fatalf("the file no longer holds %q", c.old)
			}
			_, err := Parse("own.toml", []byte(strings.Replace(c.text, c.old, c.new, 1)))
			var all userfile.Errors
			if !errors.As(err, &all) {
				t.Fatalf("got %v", err)
			}
			for _, e := range all {
				if e.Key == c.key && strings.Contains(e.Error(), c.says) && e.File == "own.toml" && (e.Line > 0 || c.key == "") {
					return
				}
			}
			t.Errorf("no mistake at %q that says %q in:\n%v", c.key, c.says, err)
		})
	}
}

// Every role's lines can be written down: the names in the table are those
// that a file may hold, and each says what it is for.
func TestTableOfLines(t *testing.T) {
	for role, specs := range lines {
		for name, s := range specs {
			if s.does == "" || strings.HasPrefix(s.does, "to ") {
				t.Errorf("%s %s does %q", role, name, s.does)
			}
			if _, twice := common[name]; twice {
				t.Errorf("%s %s is in both tables", role, name)
			}
		}
	}
	if got, want := slices.Sorted(maps.Keys(lines)), slices.Sorted(maps.Keys(figures)); !slices.Equal(got, want) {
		t.Errorf("roles with lines %v, with figures %v", got, want)
	}
}

func parseFloat(t *rapid.T, s string) float64 {
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// Identities as the makers' manuals print them, where the manual was seen
// (tags as in the files), else as remembered: each finds its own dialect and no other.
func TestIdentitiesFindTheirDialects(t *testing.T) {
	all, err := All()
	if err != nil {
		t.Fatal(err)
	}
	for reply, want := range map[string]string{
		"HEWLETT-PACKARD,E3632A,0,1.3-5.0-1.0":                                   "keysight-e363x",         // E3632A User's Guide p. 88
		"Agilent Technologies,E3646A,0,1.4-5.0-1.0":                              "keysight-e364x",         // from memory
		"Keysight Technologies,E36312A,MY12345678,1.0.3":                         "keysight-e36300",        // from memory
		"RIGOL TECHNOLOGIES,DP832,DP8A123456789,00.01.14":                        "rigol-dp800",            // from memory
		"Siglent Technologies,SPD3303X,SPD00001130025,1.01.01.01.02,V3.0":        "siglent-spd3303x",       // from memory
		"GW INSTEK,GPD-3303S,SN:EM123456,V1.09":                                  "gwinstek-gpd",           // from memory
		"GW INSTEK,GPP-4323,SN:GES123456,V1.00":                                  "gwinstek-gpp",           // from memory
		"Rohde&Schwarz,NGE103B,5601.3800k03/101234,1.54":                         "rs-nge100",              // from memory
		"THURLBY THANDAR, CPX400DP, 123456, 1.08":                                "aimtti-cpx",             // from memory
		"KEITHLEY INSTRUMENTS,MODEL 2280S-32-6,1234567,01.00":                    "keithley-2280s",         // from memory
		"HEWLETT-PACKARD,34401A,0,10-5-2":                                        "hp-34401a",              // from memory
		"Agilent Technologies,34461A,MY53200001,A.01.08-02.22-00.08-00.35-01-01": "keysight-3446x",         // Truevolt guide p. 156
		"KEITHLEY INSTRUMENTS INC., MODEL 2000, 1234567, A20/A02":                "keithley-2000",          // Keithley 2000 manual ch. 4
		"KEITHLEY INSTRUMENTS INC.,MODEL 2110,8002123,02.03-03-20":               "keithley-2110",          // from memory
		"Rigol Technologies,DM3058,DM3L123456789,01.01.00.02.02.00":              "rigol-dm3058",           // from memory
		"Siglent Technologies,SDM3055,SDM35FAC5R0104,1.01.01.19":                 "siglent-sdm3055",        // from memory
		"GWInstek,GDM8261A,GEQ123456,1.03":                                       "gwinstek-gdm8261a",      // from memory
		"AGILENT TECHNOLOGIES,DSO-X 2024A,MY12345678,02.41":                      "keysight-infiniivision", // from memory
		"RIGOL TECHNOLOGIES,DS1054Z,DS1ZA123456789,00.04.04":                     "rigol-ds1000z",          // DS1000Z guide
		"TEKTRONIX,TDS 2024B,0,CF:91.1CT FV:v22.16":                              "tektronix-tds2000",      // from memory
		"Siglent Technologies,SDS1104X-E,SDSMMEBQ2R1234,8.2.6.1.37R9":            "siglent-sds1000xe",      // from memory
		"Rohde&Schwarz,RTB2004,1333.1005k04/101234,02.300":                       "rs-rtb2000",             // from memory
		"Nightbench,practice-supply,1,1.0":                                       "standard-supply",
		"ACME,X1,0,1":                                                            "",
	} {
		f := strings.SplitN(reply, ",", 4)
		id := instruments.Identity{Maker: strings.TrimSpace(f[0]), Model: strings.TrimSpace(f[1]), Raw: reply}
		var found []string
		for _, d := range all {
			if d.Matches(id) {
				found = append(found, d.Head.Name)
			}
		}
		if got := strings.Join(found, " and "); got != want {
			t.Errorf("%s: found %q, want %q", reply, got, want)
		}
	}
}

// Each dialect that comes with the program says where its lines come from, and the guards that are from memory.
func TestDialectsAreHonest(t *testing.T) {
	all, err := All()
	if err != nil {
		t.Fatal(err)
	}
	for _, d := range all {
		if checked, ours, unchecked := d.Count(); checked+ours+unchecked != len(d.Statements()) || len(d.Statements()) < 8 {
			t.Errorf("%s: %d + %d + %d of %d statements", d.Head.Name, checked, ours, unchecked, len(d.Statements()))
		}
		for tag := range d.Sources {
			if strings.Count(d.Text, tag) < 2 && tag != "S39" { // the pot's stands for the part behind the bridge
				t.Errorf("%s names %s and cites it nowhere", d.Head.Name, tag)
			}
		}
	}
	if got := mustFind(t, RoleSupply, "standard-supply").Unproven(); len(got) != 0 {
		t.Errorf("the standard supply's guards are unproven: %v", got)
	}
	if got := mustFind(t, RoleSupply, "siglent-spd3303x").Unproven(); !slices.Contains(got, "off") || !slices.Contains(got, "output") {
		t.Errorf("unproven of the SPD3303X: %v", got)
	}
	if got := mustFind(t, RoleSupply, "gwinstek-gpd").Unproven(); !slices.Contains(got, "output") || slices.Contains(got, "off") || slices.Contains(got, "measure_voltage") {
		t.Errorf("unproven of the GPD: %v", got)
	}
}
