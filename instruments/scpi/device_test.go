package scpi

import (
	"context"
	"fmt"
	"strings"
	"testing"
)

// supply is a small device to try messages on.
type supply struct {
	*Device
	volts, amps, ovp float64
	on               [3]bool
	log              []string
}

func newSupply() *supply {
	s := &supply{Device: NewDevice(self, 4)}
	s.Value("[SOURce:]VOLTage[:LEVel][:IMMediate][:AMPLitude]", Numeric{Unit: "V", Max: 32, Default: 1},
		func(*Call) float64 { return s.volts }, func(_ *Call, v float64) error { s.volts = v; return nil })
	s.Value("[SOURce:]VOLTage:PROTection[:LEVel]", Numeric{Unit: "V", Max: 33},
		func(*Call) float64 { return s.ovp }, func(_ *Call, v float64) error { s.ovp = v; return nil })
	s.Value("[SOURce:]CURRent[:LEVel]", Numeric{Unit: "A", Max: 3},
		func(*Call) float64 { return s.amps }, func(_ *Call, v float64) error { s.amps = v; return nil })
	s.Set("[SOURce:]CURRent:PROTection:STATe", func(c *Call) error { s.note("ocp", c.Bool(0)); return nil }, Boolean{})
	s.Set("OUTPut<1-2>[:STATe]", func(c *Call) error { s.on[c.Suffix[0]] = c.Bool(0); return nil }, Boolean{})
	s.Get("OUTPut<1-2>[:STATe]", func(c *Call) (string, error) { return Bit(s.on[c.Suffix[0]]), nil })
	s.Set("OUTPut:PROTection:CLEar", func(*Call) error { s.note("clear"); return nil })
	s.Get("MEASure:VOLTage[:DC]", func(*Call) (string, error) { return NR3(s.volts - 0.001), nil })
	s.Get("MEASure:CURRent[:DC]", func(*Call) (string, error) { return NR3(0.5), nil })
	s.Set("TRIGger:SOURce", func(c *Call) error { s.note(c.Word(0)); return nil }, Choice{Words: []string{"BUS", "IMMediate"}})
	s.Set("DISPlay:TEXT", func(c *Call) error { s.note(c.Text(0)); return nil }, Text{})
	s.Set("MEMory:DATA", func(c *Call) error { s.note(len(c.Data(0))); return nil }, Data{Max: 10})
	s.Set("ROUTe:SCAN", func(c *Call) error { s.note(c.Channels(0)); return nil }, Channels{Max: 9})
	s.Set("FREQuency", func(c *Call) error { s.note(c.Number(0)); return nil }, Numeric{Unit: "HZ", Max: 1e9})
	s.Set("RESistance", func(c *Call) error { s.note(c.Number(0)); return nil }, Numeric{Unit: "OHM", Max: 1e9})
	s.Set("CONFigure:VOLTage[:DC]", func(c *Call) error { s.note(c.Word(0), c.Number(0), c.Has(1)); return nil },
		Numeric{Unit: "V", Max: 1000, Optional: true, Words: []string{"AUTO"}}, Numeric{Max: 1, Optional: true})
	return s
}

func (s *supply) note(what ...any) { s.log = append(s.log, strings.TrimSpace(fmt.Sprintln(what...))) }

// errors empties the queue and joins the codes.
func (s *supply) errors() string {
	var codes []string
	for s.Queue.Len() > 0 {
		codes = append(codes, fmt.Sprint(s.Queue.Next().Code))
	}
	return strings.Join(codes, " ")
}

func (s *supply) do(message string) string {
	return strings.TrimSuffix(string(s.Execute(context.Background(), []byte(message))), "\n")
}

func TestMessages(t *testing.T) {
	for _, c := range []struct {
		send, reply, errors string
		source              string
	}{
		// Forms of a header.
		{"VOLT 5;:VOLT?", "+5.00000000E+00", "", "IEEE 488.2 restated in Agilent 665xA programming guide pp. 12-14"},
		{":SOURce:VOLTage:LEVel:IMMediate:AMPLitude 5;AMPL?", "+5.00000000E+00", "", "same"},
		{"sour:voltage 5;:volt:lev?", "+5.00000000E+00", "", "case: Agilent 665xA pp. 12-14, HP 1650B A-6"},
		{"VOLTA 5", "", "-113", "neither long nor short form: Siglent SPD3000X QuickStart p. 27"},
		{"OUTP2 ON;OUTP2?;OUTP1?;OUTP?", "1;0;0", "", "suffix left out is 1: R&S CMU200"},
		{"OUTP3 ON", "", "-114", "R&S CMU200: header suffix out of range"},
		{"VOLT2 5", "", "-113", "a node without a suffix, from memory"},
		{"MEAS:VOLT", "", "-113", "a query only, from memory"},
		{"MNEMONICTOOLONG 1", "", "-112", "Agilent 8712ET ch. 13: over 12 characters"},
		{"*C LS", "", "-113", "white space in a header: HP 1650B A-6"},
		{"", "", "", "null message, from memory"},
		{" ; ;", "", "", "empty units, from memory"},
		{"VOLT\t\x01 5;VOLT?\r", "+5.00000000E+00", "", "white space is 0 to 32 but NL, CR before NL: HP 1650B A-6"},
		// Header paths, the six rows of Agilent 665xA pp. 12-14, Keithley 2000
		// ch. 4 and Kepco BOP-MG 3-64.
		{"CURR:LEV 3;PROT:STAT OFF", "", "", "665xA row 1"},
		{"CURR:LEV 3;CURR:PROT:STAT OFF", "", "-113", "665xA row 2"},
		{"VOLT 20;PROT 28", "", "-113", "665xA row 3"},
		{"VOLT:LEV 20;PROT 28", "", "", "665xA row 3"},
		{"OUTP:PROT:CLE;:STAT:OPER:COND?", "0", "", "665xA row 4"},
		{"OUTP OFF;*OPC;OUTP ON;OUTP?", "1", "", "665xA row 5"},
		{"CURR:LEV 3;*OPC;PROT:STAT OFF", "", "", "a common command leaves the path: Keithley 2000 ch. 4"},
		{"CURR 2;:MEAS:VOLT?;CURR?", "-1.00000000E-03;+5.00000000E-01", "", "Kepco 3-64: measured"},
		{"CURR 2;:MEAS:VOLT?;:CURR?", "-1.00000000E-03;+2.00000000E+00", "", "Kepco 3-64: programmed"},
		// Units before a command error have run, those after have not.
		{"VOLT 7;FOO 1;VOLT 8", "", "-113", "Keithley 2000 ch. 4; dropping the rest, from memory"},
		{"VOLT 99;VOLT 8;VOLT?", "+8.00000000E+00", "-222", "an execution error does not end the message, from memory"},
		// Parameters.
		{"VOLT", "", "-109", "missing parameter"},
		{"VOLT 5,6", "", "-108", "parameter not allowed"},
		{"VOLT 5 6", "", "-103", "HP 34401A: a blank instead of a comma, from memory"},
		{"TRIG:SOUR,BUS", "", "-103", "HP 34401A: a comma instead of a blank, from memory"},
		{"DISP:TEXT\"x\"", "", "-111", "IEEE 488.2: no white space after the header, from memory"},
		{"VOLT 5,", "", "-102", "from memory"},
		{"VOLT !", "", "-101", "from memory"},
		{"VOLT \x80", "", "-101", "from memory"},
		{"$", "", "-101", "from memory"},
		{"5", "", "-102", "from memory"},
		{"VOLT::LEV 5", "", "-102", "from memory"},
		{"VOLT MAX;VOLT?;VOLT? MIN;VOLT? DEFAULT", "+3.20000000E+01;+0.00000000E+00;+1.00000000E+00", "", "VOLT? MAX: Keysight E3632A, N1911A p. 75"},
		{"VOLT? 5", "", "-128", "a number where a limit word must stand"},
		{"VOLT 33", "", "-222", "data out of range"},
		{"VOLT -0.001", "", "-222", "same"},
		{"VOLT 500 MV;VOLT?", "+5.00000000E-01", "", "HP 86140A: M is milli"},
		{"VOLT .5e1 V;VOLT?", "+5.00000000E+00", "", "NRf: N1911A p. 75"},
		{"VOLT 0.5 E +1;VOLT?", "+5.00000000E+00", "", "white space round E: IEEE 488.2 7.7.2.2, from memory"},
		{"VOLT 5 HZ", "", "-131", "Agilent 8712ET ch. 13"},
		{"VOLT 5 QV", "", "-131", "no such multiplier"},
		{"VOLT 5 VOLTSANDMORE1", "", "-134", "over 12 characters"},
		{"*ESE 5 V", "", "-138", "suffix not allowed"},
		{"VOLT 1.2.3", "", "-121", "from memory"},
		{"VOLT 5E", "", "-131", "an E without digits reads as a suffix, from memory"},
		{"VOLT 5E+", "", "-121", "from memory"},
		{"VOLT 1E32001", "", "-123", "Agilent 8712ET ch. 13"},
		{"VOLT 1E400", "", "-222", "beyond any range"},
		{"VOLT " + strings.Repeat("1", 256), "", "-124", "Agilent 8712ET ch. 13: over 255 digits"},
		{"VOLT " + strings.Repeat("0", 300) + "5;VOLT?", "+5.00000000E+00", "", "leading zeros do not count"},
		{"*ESE #H1F;*ESE?;*ESE #q17;*ESE?;*ESE #B101;*ESE?", "31;15;5", "", "N1911A p. 75"},
		{"*ESE #B102", "", "-121", "from memory"},
		{"*ESE 12.6;*ESE?", "13", "", "a listener rounds, from memory"},
		{"*ESE 256", "", "-222", ""},
		{"VOLT BUS", "", "-148", "character data not allowed"},
		{"VOLT \"5\"", "", "-158", "string data not allowed"},
		{"VOLT #15hello", "", "-168", "block data not allowed"},
		{"VOLT (@1)", "", "-178", "expression data not allowed"},
		{"TRIG:SOUR 5", "", "-128", "numeric data not allowed"},
		{"TRIG:SOUR EXT", "", "-224", "illegal parameter value"},
		{"TRIG:SOUR CHARACTERSTOOLONG", "", "-144", "over 12 characters"},
		{"TRIG:SOUR B$S", "", "-141", "from memory"},
		{"DISP:TEXT 'no end", "", "-151", "from memory"},
		{"MEM:DATA #15hell", "", "-161", "from memory"},
		{"MEM:DATA #X", "", "-161", "from memory"},
		{"MEM:DATA #2111234567890!", "", "-223", "too much data"},
		{"ROUT:SCAN (@1", "", "-171", "from memory"},
		{"ROUT:SCAN (1,2)", "", "-171", "from memory"},
		{"ROUT:SCAN (@1:10)", "", "-222", ""},
		{"OUTP TRUE", "", "-224", ""},
		{"OUTP 5;OUTP?;OUTP 0.4;OUTP?", "1;0", "", "non-zero is ON: N1911A p. 75; rounded first, from memory"},
		// Common commands.
		{"*IDN?", self, "", ""},
		{"*IDN?;*OPC?", self, "-440", "a query after free text: Agilent 8712ET ch. 13"},
		{"*OPC?;*IDN?", "1;" + self, "", ""},
		{"*TST?;*SRE 255;*SRE?;SYST:VERS?", "0;191;1999.0", "", "bit 6 of *SRE does not exist: IEEE 488.2 11.3, from memory"},
		{"SYST:ERR?;ERR:NEXT?;COUN?", `0,"No error";0,"No error";0`, "", "path SYST, then SYST:ERR"},
	} {
		s := newSupply()
		if got := s.do(c.send); got != c.reply {
			t.Errorf("%q answered %q, want %q (%s)", c.send, got, c.reply, c.source)
		}
		if got := s.errors(); got != c.errors {
			t.Errorf("%q queued %q, want %q (%s)", c.send, got, c.errors, c.source)
		}
	}
}

func TestHandlersSeeTheirParameters(t *testing.T) {
	for _, c := range []struct{ send, log string }{
		{"TRIG:SOUR immediate", "IMM"},
		{`DISP:TEXT "a;b,""c"" 'd'"`, `a;b,"c" 'd'`},
		{`DISP:TEXT 'it''s'`, `it's`},
		{"MEM:DATA #15\n;,'\"", "5"},
		{"MEM:DATA #0ab;cd", "5"},
		{"ROUT:SCAN (@1,3:5, 9 : 8)", "[1 3 4 5 9 8]"},
		// The M trap (Siglent SDM3055 remote manual p. 2).
		{"FREQ 2 MHZ", "2e+06"},
		{"FREQ 2 MAHZ", "2e+06"},
		{"FREQ 2khz", "2000"},
		{"RES 2MOHM", "2e+06"},
		{"CONF:VOLT", "0 false"},
		{"CONF:VOLT:DC 10,MAX", "10 true"},
		{"CONF:VOLT 10 MAV", ""},
		{"CONF:VOLT AUTO", "AUTO 0 false"},
	} {
		s := newSupply()
		s.do(c.send)
		if got := strings.Join(s.log, "|"); got != c.log {
			t.Errorf("%q: the handler saw %q, want %q; errors %q", c.send, got, c.log, s.errors())
		}
	}
}

func TestErrorQueueOverflow(t *testing.T) { // Keithley 2000 ch. 4; Xantrex XDC app. D
	s := newSupply() // four deep
	for range 4 {
		s.do("VOLT 99")
	}
	s.do("FOO")
	if got := s.do("SYST:ERR:COUN?"); got != "4" {
		t.Errorf("count %s, want 4", got)
	}
	if got := s.errors(); got != "-222 -222 -222 -350" {
		t.Errorf("queue %q: the newest must become -350", got)
	}
	s.do("VOLT 99;*CLS")
	if got := s.do("SYST:ERR?"); got != `0,"No error"` {
		t.Errorf("after *CLS %q", got)
	}
}

func TestErrorText(t *testing.T) {
	s := newSupply()
	s.do("VOLT 99 V")
	if got := s.do("SYST:ERR?"); got != `-222,"Data out of range;99V"` {
		t.Errorf("got %s", got)
	}
	s.Push(fmt.Errorf("the %q is out", "fuse"))
	if got := s.do("SYST:ERR?"); got != `-300,"Device-specific error;the ""fuse"" is out"` {
		t.Errorf("got %s", got)
	}
	for _, c := range []struct {
		code int
		text string
	}{{-222, "Data out of range"}, {-226, "Parameter error"}, {-199, "Command error"}, {77, "Unknown error"}, {0, "No error"}} {
		if got := StandardText(c.code); got != c.text {
			t.Errorf("%d is %q, want %q", c.code, got, c.text)
		}
	}
}

// Bits and weights as in Keithley 2182A app. H and GW Instek PSU p. 135.
func TestStatus(t *testing.T) {
	s := newSupply()
	if got := s.do("*ESR?;*ESR?"); got != "128;0" {
		t.Errorf("power on: %s, want 128 once", got)
	}
	s.do("*ESE 60;*SRE 32")
	for _, c := range []struct {
		code int
		esr  string
	}{{-113, "32"}, {-222, "16"}, {-300, "8"}, {511, "8"}, {-410, "4"}, {-600, "64"}, {-500, "128"}, {-700, "2"}, {-800, "1"}} {
		s.Push(NewFault(c.code, ""))
		if got := s.do("*ESR?"); got != c.esr {
			t.Errorf("%d: event %s, want %s", c.code, got, c.esr)
		}
	}
	s.do("*CLS;FOO")
	if got := s.do("*STB?"); got != "100" { // EAV 4, ESB 32, MSS 64
		t.Errorf("status byte %s, want 100", got)
	}
	if got := s.do("*OPC?;*STB?"); got != "1;116" { // and MAV 16
		t.Errorf("with output %s, want 1;116", got)
	}
	s.do("*CLS")
	s.Status.Questionable.SetCondition(3)
	s.Status.Questionable.SetCondition(1)
	if got := s.do("STAT:QUES:COND?;EVEN?;EVEN?;ENAB 1;ENAB?"); got != "1;3;0;1" {
		t.Errorf("questionable: %s", got)
	}
	s.Status.Questionable.SetCondition(0)
	s.Status.Questionable.SetCondition(1)
	if got := s.do("*STB?;:STAT:PRES;:STAT:QUES:ENAB?"); got != "8;0" {
		t.Errorf("summary: %s, want 8;0", got)
	}
}

func TestOperationComplete(t *testing.T) {
	s := newSupply()
	busy := true
	s.Pending = func() bool { return busy }
	s.Wait = func(context.Context) error { busy = false; return nil }
	s.do("*CLS;*OPC")
	if got := s.do("*ESR?"); got != "0" {
		t.Errorf("complete while busy: %s", got)
	}
	s.Completed()
	if got := s.do("*ESR?;*OPC?"); got != "1;1" || busy {
		t.Errorf("after completion: %s, busy %v", got, busy)
	}
}

// Agilent 8712ET ch. 13; HP 70004A p. 8-14; Keysight 2000X p. 57.
func TestQueryErrors(t *testing.T) {
	s := newSupply()
	s.Write(t.Context(), []byte("VOLT?"))
	s.Write(t.Context(), []byte("*OPC?"))
	if got := string(s.Read()); got != "1\n" {
		t.Errorf("read %q: the unread response must be gone", got)
	}
	if got := s.Read(); got != nil {
		t.Errorf("read %q without a query", got)
	}
	if got := s.errors(); got != "-410 -420" {
		t.Errorf("queued %q, want -410 and -420", got)
	}
}

func TestHooks(t *testing.T) {
	s := newSupply()
	s.Reset = func() { s.volts = 0 }
	s.SelfTest = func(context.Context) int { return 3 }
	if got := s.do("VOLT 5;*RST;VOLT?;*TST?"); got != "+0.00000000E+00;3" {
		t.Errorf("got %s", got)
	}
}

func TestPatternsThatCollide(t *testing.T) {
	for _, patterns := range [][]string{
		{"VOLTage", "VOLTage"}, {"[SOURce:]VOLTage", "VOLTage[:LEVel]"}, {"VOLTage", "VOLTs"},
		{"volt"}, {"VOLT[age"}, {"VOLT[:A[:B]]"}, {"A:"}, {strings.Repeat("[A:]", 9) + "B"},
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%q were accepted", patterns)
				}
			}()
			var tree Tree
			for _, p := range patterns {
				tree.Set(p, func(*Call) error { return nil })
			}
		}()
	}
}

func TestMatchHeader(t *testing.T) {
	for text, want := range map[string]bool{"VOLT": true, "volt:dc": true, "VOLTAGE:DC": true, "CURR": false, "VOLT:AC": false, "VOLT?": false, "VOLT 1": false, "": false} {
		if got := MatchHeader("VOLTage[:DC]", text); got != want {
			t.Errorf("%q: %v, want %v", text, got, want)
		}
	}
}

func TestShortForm(t *testing.T) { // SCPI-1999 volume 1 section 6.2.1, from memory
	for long, short := range map[string]string{"VOLTage": "VOLT", "OUTPut": "OUTP", "DISPlay": "DISP", "DELay": "DEL",
		"CLEar": "CLE", "MODE": "MODE", "DATA": "DATA", "FREQuency": "FREQ", "MEASure": "MEAS", "IMMediate": "IMM", "DC": "DC"} {
		if got := ShortForm(long); got != short {
			t.Errorf("%s: %s, want %s", long, got, short)
		}
	}
}

func TestDeviceClearDropsTheOutput(t *testing.T) {
	s := newSupply()
	s.Write(t.Context(), []byte("VOLT 5;VOLT?"))
	s.Clear()
	if s.Write(t.Context(), []byte("VOLT?")); string(s.Read()) != "+5.00000000E+00\n" || s.errors() != "" {
		t.Error("a device clear must drop the output, keep settings, and be no error")
	}
}

func TestOptionalParametersAndLimits(t *testing.T) {
	d := NewDevice(self, 4)
	top := 10.0
	var saw string
	d.Set("TEST", func(c *Call) error {
		saw = fmt.Sprintln(c.Has(0), c.Has(1), c.Bool(1), c.Has(2), c.Text(2), c.Has(3), c.Data(3), c.Channels(4), c.Text(5), c.Word(6))
		return nil
	}, Numeric{Limits: func() (float64, float64, float64) { return 0, top, 1 }, Optional: true}, Boolean{Optional: true}, Text{Optional: true},
		Data{Optional: true}, Channels{Max: 3, Optional: true}, Expr{Optional: true}, Choice{Words: []string{"BUS"}, Optional: true})
	for _, c := range []struct{ send, saw string }{
		{"TEST", "false false false false  false [] []  \n"},
		{"TEST MAX,ON,'a',#11b,(@3:1),(a+b),bus", "true true true true a true [98] [3 2 1] a+b BUS\n"},
	} {
		if d.Execute(t.Context(), []byte(c.send)); saw != c.saw || d.Queue.Len() != 0 {
			t.Errorf("%s: saw %q, want %q; %d errors", c.send, saw, c.saw, d.Queue.Len())
		}
	}
	top = 5
	d.Execute(t.Context(), []byte("TEST 6"))
	if f := d.Queue.Next(); f.Code != DataOutOfRange {
		t.Errorf("above a limit that moved: %v", f)
	}
}
