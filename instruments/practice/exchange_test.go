package practice

import (
	"strings"
	"testing"
)

// Exchanges by hand and the rule each keeps. Rules are those of IEEE 488.2-1992 and
// SCPI-1999 (from memory, and as restated in the makers' manuals named in the dialect
// files), or the promises of the standard dialects (instruments/dialect/files). A reply
// ending in … has to begin so; what stands after ⏎ is a message of its own, after ~ one without a reply.
var exchanges = []struct{ on, say, want, rule string }{
	{"supply", "*IDN?", "Nightbench,practice-supply,PS-1,1.0", "488.2 10.14: four fields"},
	{"supply", "*idn?", "Nightbench,practice-supply,PS-1,1.0", "488.2 7.6.1: headers in any case"},
	{"supply", "  *IDN?  ", "Nightbench,practice-supply,PS-1,1.0", "488.2 7.4.1: white space before and after"},
	{"supply", "*IDN?\r", "Nightbench,practice-supply,PS-1,1.0", "dialect: CR before NL is taken"},
	{"supply", "SYSTem:VERSion?", "1999.0", "SCPI 21.21: version"},
	{"supply", "syst:err?", `0,"No error"`, "SCPI 21.8: empty queue"},
	{"supply", "SYSTEM:ERROR:NEXT?", `0,"No error"`, "SCPI 6.2.1: long form, optional node"},
	{"supply", "SYST:ERR:COUN?", "0", "SCPI 21.8.4: count"},
	{"supply", "~SYSTE:ERR?⏎SYST:ERR?", "-113,…", "SCPI 6.2.1: neither short nor long form"},
	{"supply", "VOLT 5;VOLT?", "+5.00000000E+00", "488.2 7.3: units joined by ;"},
	{"supply", "SOUR:VOLT:LEV 4;:VOLT?", "+4.00000000E+00", "SCPI 6.2.4: a leading colon starts at the root"},
	{"supply", "SOUR:VOLT 3;CURR 0.5;:VOLT?;:CURR?", "+3.00000000E+00;+5.00000000E-01", "SCPI 6.2.4: the path of the unit before"},
	{"supply", "VOLT 2.5V;VOLT?", "+2.50000000E+00", "488.2 7.7.3: suffix"},
	{"supply", "VOLT 1500 mV;VOLT?", "+1.50000000E+00", "488.2 7.7.3: multiplier"},
	{"supply", "VOLT 2E0;VOLT?", "+2.00000000E+00", "488.2 7.7.2: NR3"},
	{"supply", "VOLT +.5;VOLT?", "+5.00000000E-01", "488.2 7.7.2: NRf without a leading digit"},
	{"supply", "VOLT MAX;VOLT?", "+3.20000000E+01", "SCPI 7.2.1.2: MAXimum"},
	{"supply", "VOLT MINimum;VOLT?", "+0.00000000E+00", "SCPI 7.2.1.2: MINimum"},
	{"supply", "VOLT? MAX", "+3.20000000E+01", "SCPI 7.2.1.2: query of a limit"},
	{"supply", "VOLT #HA;VOLT?", "+1.00000000E+01", "488.2 7.7.4: hexadecimal"},
	{"supply", "VOLT 1.23456;VOLT?", "+1.23500000E+00", "dialect: rounded to 1 mV, and answered as rounded"},
	{"supply", "VOLT 1;VOLT 99;VOLT?⏎SYST:ERR?", "+1.00000000E+00⏎-222,…", "SCPI 21.8.10: out of range, the old setting stays"},
	{"supply", "VOLT:PROT 8;:VOLT 9;VOLT?⏎SYST:ERR?⏎VOLT:PROT MAX;PROT?", "+0.00000000E+00⏎-221,…⏎+3.30000000E+01", "dialect: above VOLT:PROT is a conflict"},
	{"supply", "VOLT⏎SYST:ERR?", "-109,…", "SCPI 21.8.9: missing parameter"},
	{"supply", "VOLT 1,2⏎SYST:ERR?", "-108,…", "SCPI 21.8.9: parameter not allowed"},
	{"supply", "VOLT 1A⏎SYST:ERR?", "-131,…", "SCPI 21.8.9: invalid suffix"},
	{"supply", `VOLT "1"⏎SYST:ERR?`, "-158,…", "SCPI 21.8.9: string not allowed"},
	{"supply", "VOLT 1 2⏎SYST:ERR?", "-103,…", "SCPI 21.8.9: invalid separator"},
	{"supply", "NONE 1;VOLT 7⏎SYST:ERR?⏎SYST:ERR?⏎VOLT?", "-113,…⏎0,…⏎+0.00000000E+00", "488.2 6.1.7: after a command error the rest is dropped"},
	{"supply", "VOLT!⏎SYST:ERR?", "-101,…", "SCPI 21.8.9: invalid character"},
	{"supply", "OUTP?", "0", "SCPI 7.3: boolean answered as 0 or 1; off at power-on"},
	{"supply", "OUTP ON;OUTP?;:OUTP 0;OUTP?", "1;0", "SCPI 7.3: ON and 0"},
	{"supply", "OUTP MAYBE⏎SYST:ERR?", "-224,…", "SCPI 21.8.10: a value that is none of the list"},
	{"supply", "*ESR?⏎*ESR?", "128⏎0", "488.2 11.5.1: power-on bit, cleared by reading"},
	{"supply", "*ESR?⏎BAD⏎*ESR?", "128⏎32", "488.2 11.5.1.1.4: command error is bit 5"},
	{"supply", "*ESR?⏎VOLT 99⏎*ESR?", "128⏎16", "488.2 11.5.1.1.5: execution error is bit 4"},
	{"supply", "*ESE 60;*ESE?", "60", "488.2 10.10: event enable"},
	{"supply", "*SRE 96;*SRE?", "32", "488.2 10.34: bit 6 is not kept"},
	{"supply", "*OPC?", "1", "488.2 10.19"},
	{"supply", "*TST?", "0", "488.2 10.38: passed"},
	{"supply", "BAD⏎*STB?⏎*CLS;*STB?", "4⏎0", "SCPI 9: bit 2, errors in the queue; *CLS empties it"},
	{"supply", "*IDN?;VOLT?⏎SYST:ERR?", "Nightbench,…⏎-440,…", "488.2 6.3.7: nothing after a response of free text"},
	{"supply", "VOLT 3;*RST;VOLT?;:OUTP?", "+0.00000000E+00;0", "dialect: *RST is 0 V and off"},
	{"supply", "STAT:QUES:COND?", "0", "dialect: neither CC nor CV with the output off"},
	{"average", "FUNC?", `"VOLT:DC"`, "SCPI 19.9: function as a string"},
	{"average", `FUNC "CURR";FUNC?`, `"CURR:DC"`, "SCPI 19.9"},
	{"average", `FUNC 'VOLT:DC';FUNC?`, `"VOLT:DC"`, "488.2 7.7.5: single quotes"},
	{"average", `FUNC "OHMS"⏎SYST:ERR?`, "-224,…", "SCPI 21.8.10: illegal parameter value"},
	{"average", "VOLT:RANG 9;RANG?;RANG:AUTO?", "+1.00000000E+01;0", "dialect: next range up, auto goes off"},
	{"average", "VOLT:RANG 10.5;RANG?", "+1.00000000E+02", "dialect: not the nearest"},
	{"average", "VOLT:NPLC 5;NPLC?", "+1.00000000E+01", "dialect: next aperture up"},
	{"scope", "~TRAC? CH1⏎SYST:ERR?", "-230,…", "dialect: no record, no reply"},
	{"scope", "FORM?;:FORM:BORD?", "INT,16;NORM", "SCPI 4 and 9: format and byte order"},
	{"scope", "~INP9:COUP?⏎SYST:ERR?", "-114,…", "SCPI 21.8.9: suffix out of range"},
	{"scope", "SENS1:VOLT:RANG:UPP 1;LOW 2;:INIT⏎SYST:ERR?", "-221,…", "dialect: UPP not above LOW, said at INIT"},
	{"scope", "TRIG:SOUR CH2;SOUR?;LEV 1.5;LEV?;SLOP NEG;SLOP?", "CH2;+1.50000000E+00;NEG", "dialect"},
	{"pot", "WIP 100;WIP?;WIP? MAX", "100;256", "dialect: the code read back, and the highest"},
	{"pot", "WIP 257⏎SYST:ERR?⏎WIP?", "-222,…⏎128", "dialect: out of range moves nothing"},
}

func TestExchanges(t *testing.T) {
	for _, c := range exchanges {
		atDesk(t, steady(), func(d *desk) {
			wants := strings.Split(c.want, "⏎")
			for _, say := range strings.Split(c.say, "⏎") {
				say, silent := strings.CutPrefix(say, "~")
				if silent || !strings.Contains(say, "?") {
					d.tell(c.on, say)
					continue
				}
				if len(wants) == 0 {
					t.Fatalf("%q asks more than is expected", c.say)
				}
				got := d.ask(c.on, say)
				want, begins := strings.CutSuffix(wants[0], "…")
				if begins && !strings.HasPrefix(got, want) || !begins && got != want {
					t.Errorf("%s: %q: %q answers %q, expected %q (%s)", c.on, c.say, say, got, wants[0], c.rule)
				}
				wants = wants[1:]
			}
		})
	}
	if len(exchanges) < 40 {
		t.Errorf("%d exchanges", len(exchanges))
	}
}
