package conformance

// nr3 is a number in NR3 form, of which the first digits are given.
func nr3(digits string) string { return `[+]?` + digits + `0*E[+]?0*0` }

// Of are the exchanges of instruments of a role, beyond Common: settings at output off,
// read back. They hold for instruments that keep to the standard dialects.
var Of = map[string][]Exchange{
	"supply": {
		{Rule: "SCPI 7.3: off after *RST, a boolean is 0 or 1", Say: "*RST⏎OUTP?", Want: "0"},
		{Rule: "SCPI 7.3: OFF as a word", Say: "OUTP OFF;OUTP?", Want: "0"},
		{Rule: "SCPI 7.3: 0 as a number", Say: "OUTP 0;OUTP:STAT?", Want: "0"},
		{Rule: "SCPI 21.8.10: a word that is none of the list", Say: "OUTP MAYBE", Code: "-224|-1.."},
		{Rule: "SCPI 19.21: a level and its long form", Say: "SOURce:VOLTage:LEVel:IMMediate:AMPLitude 3⏎VOLT?", Want: nr3(`3\.`)},
		{Rule: "488.2 7.7.3: a unit", Say: "VOLT 2.5V;VOLT?", Want: nr3(`2\.5`)},
		{Rule: "488.2 7.7.3: a multiplier", Say: "VOLT 1500 mV;VOLT?", Want: nr3(`1\.5`)},
		{Rule: "488.2 7.7.3: a wrong unit", Say: "VOLT 1A", Code: "-131"},
		{Rule: "SCPI 7.2.1.2: MINimum", Say: "VOLT MIN;VOLT?", Want: nr3(`0\.`)},
		{Rule: "SCPI 7.2.1.2: a limit is asked", Say: "VOLT? MAX", Want: `[+]?\d\.\d+E[+]?\d+`},
		{Rule: "SCPI 21.8.10: the old setting stays", Say: "VOLT 1⏎VOLT 9999⏎VOLT?", Want: nr3(`1\.`), Code: "-222"},
		{Rule: "standard-supply: neither CC nor CV at output off", Say: "OUTP OFF⏎STAT:QUES:COND?", Want: "0"},
		{Rule: "standard-supply: terminals are measured at output off", Say: "*RST⏎MEAS:VOLT?", Want: `[-+]?\d\.\d+E[-+]?\d+`},
		{Rule: "standard-supply: *RST is 0 V", Say: "VOLT 3⏎*RST⏎VOLT?", Want: nr3(`0\.`)},
		{Rule: "standard-supply: output on and off", Say: "VOLT 1;OUTP ON;OUTP?;OUTP OFF;OUTP?", Want: "1;0"},
		{Rule: "standard-supply: a clear without a trip", Say: "OUTP OFF⏎VOLT:PROT:CLE⏎VOLT:PROT:TRIP?", Want: "0"},
	},
	"meter": {
		{Rule: "SCPI 19.9: a function is a string", Say: `FUNC "VOLT:DC";FUNC?`, Want: `"VOLT(:DC)?"`},
		{Rule: "488.2 7.7.5: single quotes", Say: "FUNC 'CURR';FUNC?", Want: `"CURR(:DC)?"`},
		{Rule: "SCPI 21.8.10: an unknown function", Say: `FUNC "LEAF"`, Code: "-224"},
		{Rule: "SCPI 21.8.9: a word for a string", Say: "FUNC VOLT", Code: "-1(04|48)"},
		{Rule: "standard-meter: the next range up", Say: "VOLT:RANG 9;RANG?", Want: nr3(`1\.`) + `|[+]?1\.0*E[+]?0*1`},
		{Rule: "standard-meter: a fixed range ends auto-ranging", Say: "VOLT:RANG:AUTO ON⏎VOLT:RANG 1;RANG:AUTO?", Want: "0"},
		{Rule: "standard-meter: above the highest range", Say: "VOLT:RANG 1E6", Code: "-222"},
		{Rule: "SCPI 16: an aperture in periods of the line", Say: "VOLT:DC:NPLC 1;NPLC?", Want: nr3(`1\.`)},
		{Rule: "SCPI 3.6: READ? takes a reading", Say: "VOLT:NPLC 0.02⏎READ?", Want: `[-+]?\d\.\d+E[-+]?\d+`},
		{Rule: "SCPI 3.6: FETCh? without a reading", Say: "*RST⏎~FETC?", Code: "-230"},
	},
	"scope": {
		{Rule: "SCPI 4: no record, no reply", Say: "*RST⏎~TRAC? CH1", Code: "-230"},
		{Rule: "SCPI 9: format and byte order", Say: "FORM INT,16;:FORM?;:FORM:BORD?", Want: "INT,16;NORM"},
		{Rule: "SCPI 6.2.5.2: a numeric suffix", Say: "INP2:COUP AC;COUP?;:INP1:COUP?", Want: "AC;DC"},
		{Rule: "SCPI 6.2.5.2: the suffix 1 may be left out", Say: "INP:ATT 10;:INP1:ATT?", Want: nr3(`1\.`) + `|[+]?1\.0*E[+]?0*1`},
		{Rule: "SCPI 6.2.5.2: a suffix out of range", Say: "~INP9:COUP?", Code: "-114"},
		{Rule: "SCPI 24: character data in short form", Say: "TRIG:SLOP POSITIVE;SLOP?", Want: "POS"},
		{Rule: "SCPI 7.2: a whole number", Say: "SENS:SWE:POIN 1000;POIN?", Want: `[+]?1\.0*E[+]?0*3`},
		{Rule: "488.2 7.7.3: micro", Say: "SENS:SWE:TIME 500US;TIME?", Want: `[+]?5\.0*E-0*4`},
		{Rule: "standard-scope: the screen upside down", Say: "SENS1:VOLT:RANG:UPP 1;LOW 2⏎INIT⏎*RST", Code: "-221"},
		{Rule: "standard-scope: more samples a second than it has", Say: "SENS:SWE:POIN MAX;TIME 1US⏎INIT⏎*RST", Code: "-221"},
	},
	"pot": {
		{Rule: "nightbench-pot: the code read back, and the highest", Say: "WIP 100;WIP?⏎WIP? MAX", Want: `100⏎\d+`},
		{Rule: "nightbench-pot: out of range moves nothing", Say: "WIP 3⏎WIP 99999⏎WIP?", Want: "3", Code: "-222"},
		{Rule: "nightbench-pot: power-ons are counted", Say: "WIP:POW?", Want: `\d+`},
	},
	"cutoff": {
		{Rule: "nightbench-relay: open after *RST", Say: "*RST⏎CLOS?", Want: "0"},
		{Rule: "nightbench-relay: its time", Say: "TIME 2;TIME?", Want: nr3(`2\.`)},
		{Rule: "nightbench-relay: a time it can't hold", Say: "TIME 3600", Code: "-222"},
		{Rule: "nightbench-relay: FEED closes, OPEN opens", Say: "FEED;CLOS?;OPEN;CLOS?", Want: "1;0"},
	},
	"thermometer": {
		{Rule: "nightbench-probe: degrees with two decimals", Say: "TEMP?", Want: `-?\d+\.\d\d`},
	},
}
