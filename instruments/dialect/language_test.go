package dialect

import (
	"errors"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"nightbench/instruments/userfile"
)

// Mistakes in what the language says beyond the standard nodes, each with its line and key.
func TestMistakesOfTheLanguage(t *testing.T) {
	text := func(role Role, name string) string { return mustFind(t, role, name).Text }
	gpd, dp, tek := text(RoleSupply, "gwinstek-gpd"), text(RoleSupply, "rigol-dp800"), text(RoleScope, "tektronix-tds2000")
	keysight, rigol, siglent := text(RoleScope, "keysight-infiniivision"), text(RoleScope, "rigol-ds1000z"), text(RoleScope, "siglent-sds1000xe")
	dm, aim, e364x := text(RoleMeter, "rigol-dm3058"), text(RoleSupply, "aimtti-cpx"), text(RoleSupply, "keysight-e364x")
	for name, c := range map[string]struct {
		text, old, new string
		key, says      string
	}{
		"LinkWithoutSource":      {gpd, "clear = \"none\"\nsource = \"S22\"", `clear = "none"`, "link.source", "missing"},
		"UncheckedNothing":       {gpd, `unchecked = ["kinds", "line"]`, `unchecked = ["baud"]`, "link.unchecked", "baud"},
		"UnknownKind":            {gpd, `kinds = ["serial"]`, `kinds = ["parallel"]`, "link.kinds", "hislip"},
		"UnknownClear":           {gpd, `clear = "none"`, `clear = "reset"`, "link.clear", "break"},
		"ClearBytesWithoutWord":  {gpd, `clear = "none"`, `clear = "bytes"`, "link.clear", "belong together"},
		"ClearReplyWithoutBreak": {tek, `clear = "break"`, `clear = "reopen"`, "link.clear_reply", "break"},
		"SerialLineUnreadable":   {gpd, `line = "baud=9600"`, `line = "9600 8N1"`, "link.line", "baud=9600"},
		"TextErrorsWithoutNone":  {gpd, "none = [\"No Error.\", \"No Error\"]\n", "", "errors.none", "missing"},
		"EventsWithoutStatus":    {tek, "status = \"*ESR?\"\n", "", "errors.status", "missing"},
		"PolledWithoutUntil":     {dp, "until = [\"1\"]\n", "", "completion.until", "missing"},
		"DwellWithoutTime":       {dp, `style = "polled"`, `style = "dwell"`, "completion.dwell", "missing"},
		"ChannelSaysNothing":     {e364x, "select = { send = \"INST:SEL OUT{channel}\", rest = \"50 ms\", source = \"unchecked\" }\ncount = 2\nsource = \"S17\"\n", "", "channel", "says nothing"},
		"NamesAndCount":          {e364x, "count = 2", "count = 2\nnames = [\"P6V\"]", "channel.names", "1 names for 2"},
		"BitTooHigh":             {gpd, "bit = 5", "bit = 40", "command.output.bit", "31"},
		"UnknownBase":            {gpd, `base = "characters", bit = 5`, `base = "octal", bit = 5`, "command.output.base", "characters"},
		"UnknownAskSource":       {gpd, `ask_source = "unchecked", note = "which`, `ask_source = "S1", note = "which`, "command.output.ask_source", "no such tag"},
		"RestWithoutUnit":        {gpd, `rest = "400 ms"`, `rest = "400"`, "command.on.rest", "unit"},
		"ChoiceWithoutUnit":      {dm, `["200 mV", "0"]`, `["two", "0"]`, "command.voltage_range.choices", "two"},
		"ChoiceTwice":            {dm, `["2 V", "1"]`, `["200 mV", "1"]`, "command.voltage_range.choices", "twice"},
		"CountsWithoutStep":      {aim, "counts = 2 # of the last digit\nresolution = \"10 mV\"", "counts = 2", "accuracy[1].counts", "resolution"},
		"DivisionsWithoutScreen": {text(RoleScope, "standard-scope"), `offset = "2 mV"`, "divisions = 0.1", "accuracy[1].divisions", "screen"},
		"DutyWithoutItsUnit":     {keysight, `in = "percent", `, "", "command.measure_duty", "percent"},
		"BeforeIsAQuery":         {tek, `"MEASU:IMM:TYP FREQ"`, `"MEASU:IMM:TYP?"`, "command.measure_frequency.before", "without a reply"},
		"UnknownInPrefix":        {siglent, `prefix = ["C{channel}:CPL "]`, `prefix = ["C{value}:CPL "]`, "command.coupling.prefix", "{value}"},
		"UnknownOffset":          {keysight, `offset = "centre"`, `offset = "middle"`, "screen.offset", "centre"},
		"FieldMissing":           {keysight, `"yincrement", "yorigin"`, `"yincrement", "-"`, "waveform.family", "yorigin"},
		"FieldUnknown":           {keysight, `"xreference"`, `"xref"`, "waveform.family", "xref"},
		"NoSampleRate":           {siglent, "sample_rate =", "# sample_rate =", "waveform.family", "sample_rate"},
		"NoCodesADivision":       {siglent, "codes_per_division = 25\n", "", "waveform.codes_per_division", "missing"},
		"VoltsNeedNumbers":       {keysight, `family = "volts-origin"`, `family = "volts"`, "waveform.samples", "real32"},
		"BytesNeedAHead":         {keysight, `tail = "nl"`, `head = "none"`, "waveform.head", "text"},
		"PartsWithoutASize":      {rigol, "most_a_read = 250_000", "# most", "command", "belong together"},
		"StopThatIsNotThere":     {rigol, "\nstop = ", "\n# stop = ", "command", "needs_stop"},
		"NoWayToSetTheScreen":    {keysight, "\nvertical_offset = ", "\n# = ", "command", "screen can't be set"},
		"NoWayToSetTheTime":      {keysight, "\ntime_scale = ", "\n# = ", "command", "time can't be set"},
		"NoCountOfSamples":       {keysight, "\npoints = ", "\n# = ", "command", "count of samples"},
		"NoWayWithoutATrigger":   {keysight, "\ntrigger_none = ", "\n# = ", "command", "trigger_none, or force"},
		"NoScreen":               {keysight, "[screen]\ndivisions = 8\ntime_divisions = 10\noffset = \"centre\"\nsource = \"unchecked\"", "", "command", "[screen]"},
		"NoReading":              {dm, "\nvoltage_read = ", "\n# = ", "command", "voltage_read"},
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
				if e.Key == c.key && strings.Contains(e.Error(), c.says) && e.File == "own.toml" {
					return
				}
			}
			t.Errorf("no mistake at %q that says %q in:\n%v", c.key, c.says, err)
		})
	}
}

func TestSettle(t *testing.T) {
	ranges := Line{Send: "R {value}", Decimals: -1, Choices: []Choice{{0.2, "0"}, {2, "1"}, {20, "2"}}}
	for _, c := range []struct {
		name string
		line Line
		v    float64
		want string
	}{
		{"NextChoiceUp", ranges, 0.3, "R 1"},
		{"TheChoiceItself", ranges, 20, "R 2"},
		{"Series", Line{Send: "S {value}", Series: true, Decimals: -1}, 0.0143, "S 0.02"},
		{"SeriesExactly", Line{Send: "S {value}", Series: true, Decimals: -1}, 0.005, "S 0.005"},
		{"SeriesOverADecade", Line{Send: "S {value}", Series: true, Decimals: -1}, 6, "S 10"},
		{"Decimals", Line{Send: "V{value}", Decimals: 3}, 12.3456789, "V12.346"},
		{"AsItIs", Line{Send: "V {value}", Decimals: -1}, 12.3456789, "V 12.3456789"},
	} {
		p, err := c.line.Settle(Put{Value: c.v})
		if got := p.Fill(c.line.Send); err != nil || got != c.want {
			t.Errorf("%s: %q, %v, want %q", c.name, got, err, c.want)
		}
	}
	if _, err := ranges.Settle(Put{Value: 21}); !errors.Is(err, ErrCannot) {
		t.Errorf("above the highest choice: %v", err)
	}
	for word, want := range map[string]float64{"1": 2, "+1.0E+00": 2, "2": 20} {
		if got, ok := ranges.Chosen(word); !ok || got != want {
			t.Errorf("%q is %g, %v", word, got, ok)
		}
	}
	if _, ok := ranges.Chosen("7"); ok {
		t.Error("a word of no choice was taken")
	}
}

func TestAnswer(t *testing.T) {
	for _, c := range []struct {
		name  string
		line  Line
		reply string
		want  string
	}{
		{"Header", Line{Prefix: []string{"C{channel}:VDIV "}}, "C2:VDIV 5.00E-01V", "5.00E-01V"}, // Siglent SDS1104X-E p. 142
		{"HeaderOff", Line{Prefix: []string{"C{channel}:VDIV "}}, "5.00E-01V", "5.00E-01V"},
		{"HeaderInAnotherCase", Line{Prefix: []string{":ch{channel}:scale "}}, ":CH2:SCALE 1.0E0", "1.0E0"}, // Tektronix p. 2-69
		{"OneOfSeveral", Line{Field: 2, Separator: ","}, "2.0000, 0.0500,0.100", "0.0500"},
		{"OtherSeparator", Line{Field: 3, Separator: ";"}, "1;2;3", "3"},
	} {
		got, err := c.line.Answer(Put{Channel: 2}, c.reply)
		if err != nil || got != c.want {
			t.Errorf("%s: %q, %v", c.name, got, err)
		}
	}
	if _, err := (Line{Field: 4, Separator: ","}).Answer(Put{}, "1,2,3"); err == nil {
		t.Error("a part that is not there was found")
	}
}

func TestNamesOfChannels(t *testing.T) {
	d := &Dialect{Channel: &Channel{Count: 2, Names: []string{"P6V", "N25V"}}}
	if got := d.Put(5, 2).Fill("APPL {channel},{value}"); got != "APPL N25V,5" {
		t.Errorf("got %q", got)
	}
}

// The five forms in which makers state limits of error.
func TestFormsOfAccuracy(t *testing.T) {
	for _, c := range []struct {
		name   string
		figure func() Figure
		at     float64
		want   float64
	}{
		// Keithley 2016: 10 V range, 5 V, 30 ppm + 5 ppm: 150 µV + 50 µV
		{"PpmOfReadingAndRange", func() Figure { f, _ := mustFind(t, RoleMeter, "keithley-2000").Figure("voltage", 10, 1); return f }, 5, 200e-6},
		// 0.1 % and 2 counts of 10 mV
		{"Counts", func() Figure {
			f, _ := mustFind(t, RoleSupply, "aimtti-cpx").Figure("measure_voltage", 0, 1)
			return f
		}, 5, 5e-3 + 20e-3},
		// E364xA p. 192: output 2: 0.1 % + 25 mV
		{"OutputAndOffset", func() Figure {
			f, _ := mustFind(t, RoleSupply, "keysight-e364x").Figure("measure_voltage", 0, 2)
			return f
		}, 5, 5e-3 + 25e-3},
		// and of output 1: 0.05 % + 5 mV
		{"OfItsChannel", func() Figure {
			f, _ := mustFind(t, RoleSupply, "keysight-e364x").Figure("measure_voltage", 0, 1)
			return f
		}, 3.3, 6.65e-3},
	} {
		f := c.figure()
		if got := f.Accuracy.Limit(c.at, f.Range); math.Abs(got-c.want) > 1e-9 {
			t.Errorf("%s: limit %g at %g, want %g", c.name, got, c.at, c.want)
		}
	}
	// A scope: gain of the distance from the offset, and a share of a division, on a screen of 8 V from 0 to 8 V:
	// at most 3 % of (|reading| + 4 V), 0.1 div of 1 V, and 1 mV.
	f, _ := mustFind(t, RoleScope, "tektronix-tds2000").Figure("voltage", 0, 1)
	a := f.At(4)
	if got, want := a.Limit(2, 8), 0.03*2+0.03*4+0.1+1e-3; math.Abs(got-want) > 1e-9 {
		t.Errorf("of a scope: limit %g, want %g", got, want)
	}
	// Rigol DS1000Z-E: 25 ppm + 5 ppm a year
	if got := mustFind(t, RoleScope, "rigol-ds1000z").Waveform.TimeBase; math.Abs(got-30e-6) > 1e-12 {
		t.Errorf("time base %g", got)
	}
}

func TestLinkOfADialect(t *testing.T) {
	l := mustFind(t, RoleSupply, "gwinstek-gpd").Link
	if l.ReplyEnd != '\r' || l.Terminator != "\n" || l.Gap != 80*time.Millisecond || l.Longest != 15 || !slices.Equal(l.Kinds, []string{"serial"}) {
		t.Errorf("GPD: %+v", l)
	}
	l = mustFind(t, RoleScope, "tektronix-tds2000").Link
	if l.Clear != "break" || l.ClearReply != "DCL" {
		t.Errorf("TDS: %+v", l)
	}
	l = mustFind(t, RoleMeter, "hp-34401a").Link
	if l.Clear != "bytes" || string(l.ClearBytes) != "\x03" || l.Longest != 100 {
		t.Errorf("34401A: %+v", l)
	}
}

// Keys from memory in a section from a manual are counted apart.
func TestUncheckedKeys(t *testing.T) {
	d := mustFind(t, RoleSupply, "gwinstek-gpd")
	all := d.Statements()
	if !slices.Contains(all, Stated{"link", "S22"}) || !slices.Contains(all, Stated{"link.line", Unchecked}) {
		t.Errorf("statements %v", all)
	}
}
