package drivertest

import "time"

// GPD3303S is no SCPI instrument (GPD-3303 manual pp. 41-42, GPD-X303S p. 46):
// lines end in LF and replies in CR, a message that comes within 70 ms or is
// longer than 15 characters is lost, one switch serves all outputs, and
// STATUS? is a row of characters: CC or CV of both channels, tracking, beeper,
// output, baud rate.
func GPD3303S() *MakerSupply {
	s := newMakerSupply(2, "\r")
	s.Least, s.Most = 70*time.Millisecond, 15
	fault := "No Error."
	s.unknown = func(string) { fault = "Undefined Header." }
	s.says(`\*IDN\?`, "GW INSTEK,GPD-3303S,SN:EM123456,V1.09")
	s.on(`ERR\?`, func([]string) string { f := fault; fault = "No Error."; return f })
	s.takes(`LOCAL|REMOTE`)
	s.on(`VSET([12]):`+num, func(p []string) string { s.at(p[1]).Volts = number(p[2]); return "" })
	s.on(`VSET([12])\?`, func(p []string) string { return fixed(3, s.at(p[1]).Volts) + "V" })
	s.on(`ISET([12]):`+num, func(p []string) string { s.at(p[1]).Limit = number(p[2]); return "" })
	s.on(`ISET([12])\?`, func(p []string) string { return fixed(3, s.at(p[1]).Limit) + "A" })
	s.on(`OUT([01])`, func(p []string) string {
		for _, o := range s.Out {
			o.On = p[1] == "1"
		}
		return ""
	})
	s.on(`VOUT([12])\?`, func(p []string) string { v, _ := s.at(p[1]).look(); return fixed(3, v) + "V" })
	s.on(`IOUT([12])\?`, func(p []string) string { _, i := s.at(p[1]).look(); return fixed(3, i) + "A" })
	s.on(`STATUS\?`, func([]string) string {
		time.Sleep(400 * time.Millisecond)
		row := ""
		for _, o := range s.Out {
			row += word("0", "1", o.limiting())
		}
		return row + "01" + "1" + word("1", "0", s.Out[0].On) + "10"
	})
	return s
}

// GPP4323 mixes both of its maker's manners (GPP-2323 manual pp. 128, 156).
func GPP4323() *MakerSupply {
	s := newMakerSupply(4, "\n")
	q := &queue{none: `0,"No error"`}
	s.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	s.says(`\*IDN\?`, "GW INSTEK,GPP-4323,SN:GES123456,V1.00")
	s.on(`:SYST:ERR\?`, q.next)
	s.on(`VSET([1-4]):`+num, func(p []string) string { s.at(p[1]).Volts = number(p[2]); return "" })
	s.on(`VSET([1-4])\?`, func(p []string) string { return fixed(3, s.at(p[1]).Volts) })
	s.on(`ISET([1-4]):`+num, func(p []string) string { s.at(p[1]).Limit = number(p[2]); return "" })
	s.on(`ISET([1-4])\?`, func(p []string) string { return fixed(4, s.at(p[1]).Limit) })
	s.on(`:OUTP([1-4]):STAT (ON|OFF)`, func(p []string) string { s.at(p[1]).On = p[2] == "ON"; return "" })
	s.on(`:OUTP([1-4]):STAT\?`, func(p []string) string { s.at(p[1]).look(); return word("ON", "OFF", s.at(p[1]).On) })
	s.on(`:OUTP([1-4]):OVP `+num, func(p []string) string { s.at(p[1]).Over = number(p[2]); return "" })
	s.on(`:OUTP([1-4]):OVP\?`, func(p []string) string { return fixed(2, s.at(p[1]).Over) })
	s.on(`:OUTP([1-4]):OVP:STAT (ON|OFF)`, func(p []string) string { s.at(p[1]).Armed = p[2] == "ON"; return "" })
	s.on(`:OUTP([1-4]):OVP:STAT\?`, func(p []string) string { return word("ON", "OFF", s.at(p[1]).Armed) })
	s.on(`:OUTP([1-4]):OVP:TRIG\?`, func(p []string) string { s.at(p[1]).look(); return word("1", "0", s.at(p[1]).TrippedOver) })
	s.on(`VOUT([1-4])\?`, func(p []string) string { v, _ := s.at(p[1]).look(); return fixed(4, v) })
	s.on(`IOUT([1-4])\?`, func(p []string) string { _, i := s.at(p[1]).look(); return fixed(4, i) })
	return s
}

// NGE103B has a switch a channel behind a master switch, and an electronic
// fuse in place of an over-current level.
func NGE103B() *MakerSupply {
	s := newMakerSupply(3, "\n")
	q := &queue{none: `0,"No error"`}
	s.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	selected, master, enabled := 0, false, make([]bool, 3)
	at := func() *Output { return s.Out[selected] }
	update := func() {
		for n, o := range s.Out {
			o.On = master && enabled[n]
		}
	}
	s.says(`\*IDN\?`, "Rohde&Schwarz,NGE103B,5601.3800k03/101234,1.54")
	s.says(`\*OPC\?`, "1")
	s.on(`SYST:ERR\?`, q.next)
	s.takes(`SYST:(REM|LOC)`)
	s.on(`INST:NSEL ([123])`, func(p []string) string { selected = int(number(p[1])) - 1; return "" })
	s.on(`OUTP:SEL (ON|OFF)`, func(p []string) string { enabled[selected] = p[1] == "ON"; update(); return "" })
	s.on(`OUTP:GEN (ON|OFF)`, func(p []string) string { master = p[1] == "ON"; update(); return "" })
	s.on(`OUTP\?`, func([]string) string { at().look(); return word("1", "0", at().On) })
	s.on(`VOLT `+num, func(p []string) string { at().Volts = number(p[1]); return "" })
	s.on(`VOLT\?`, func([]string) string { return fixed(3, at().Volts) })
	s.on(`CURR `+num, func(p []string) string { at().Limit = number(p[1]); return "" })
	s.on(`CURR\?`, func([]string) string { return fixed(4, at().Limit) })
	s.on(`VOLT:PROT `+num, func(p []string) string { at().Over = number(p[1]); return "" })
	s.on(`VOLT:PROT\?`, func([]string) string { return fixed(3, at().Over) })
	s.on(`VOLT:PROT:MODE MEAS`, func([]string) string { at().Armed = true; return "" })
	s.on(`VOLT:PROT:MODE\?`, func([]string) string { return word("MEAS", "PROT", at().Armed) })
	s.on(`VOLT:PROT:TRIP\?`, func([]string) string { at().look(); return word("1", "0", at().TrippedOver) })
	s.on(`VOLT:PROT:CLE`, func([]string) string { at().clear(false); return "" })
	s.on(`FUSE ON`, func([]string) string { at().ArmedCurrent = true; return "" })
	s.on(`FUSE:TRIP\?`, func([]string) string { return word("1", "0", at().TrippedAmp) })
	s.on(`MEAS:VOLT\?`, func([]string) string { v, _ := at().look(); return fixed(3, v) })
	s.on(`MEAS:CURR\?`, func([]string) string { _, i := at().look(); return fixed(4, i) })
	return s
}

// CPX400DP speaks in words of its own (CPX200D manual p. 28): settings answer
// with their word in front, measured values with their unit, LSR1? bit 2 is an
// over-voltage trip and reading clears it, TRIPRST clears the trip.
func CPX400DP() *MakerSupply {
	s := newMakerSupply(2, "\r\n")
	s.says(`\*IDN\?`, "THURLBY THANDAR, CPX400DP, 123456, 1.08")
	s.says(`\*OPC\?`, "1")
	s.takes(`\*CLS|LOCAL`)
	s.on(`V([12]) `+num, func(p []string) string { s.at(p[1]).Volts = number(p[2]); return "" })
	s.on(`V([12])\?`, func(p []string) string { return "V" + p[1] + " " + fixed(2, s.at(p[1]).Volts) })
	s.on(`I([12]) `+num, func(p []string) string { s.at(p[1]).Limit = number(p[2]); return "" })
	s.on(`I([12])\?`, func(p []string) string { return "I" + p[1] + " " + fixed(3, s.at(p[1]).Limit) })
	s.on(`OVP([12]) `+num, func(p []string) string { s.at(p[1]).Over, s.at(p[1]).Armed = number(p[2]), true; return "" })
	s.on(`OVP([12])\?`, func(p []string) string { return "VP" + p[1] + " " + fixed(1, s.at(p[1]).Over) })
	s.on(`OP([12]) ([01])`, func(p []string) string { s.at(p[1]).On = p[2] == "1"; return "" })
	s.on(`OP([12])\?`, func(p []string) string { s.at(p[1]).look(); return word("1", "0", s.at(p[1]).On) })
	s.on(`LSR([12])\?`, func(p []string) string { s.at(p[1]).look(); return word("4", "1", s.at(p[1]).TrippedOver) })
	s.on(`TRIPRST`, func([]string) string {
		for _, o := range s.Out {
			o.clear(false)
		}
		return ""
	})
	s.on(`V([12])O\?`, func(p []string) string { v, _ := s.at(p[1]).look(); return fixed(2, v) + "V" })
	s.on(`I([12])O\?`, func(p []string) string { _, i := s.at(p[1]).look(); return fixed(3, i) + "A" })
	return s
}

// K2280S says which protection tripped in a word (2280S Reference p. 7-58).
func K2280S() *MakerSupply {
	s := newMakerSupply(1, "\n")
	o, q := s.Out[0], &queue{none: `0,"No error"`}
	s.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	s.says(`\*IDN\?`, "KEITHLEY INSTRUMENTS,MODEL 2280S-32-6,1234567,01.00")
	s.says(`\*OPC\?`, "1")
	s.on(`:SYST:ERR\?`, q.next)
	s.on(`:VOLT `+num, func(p []string) string { o.Volts = number(p[1]); return "" })
	s.on(`:VOLT\?`, func([]string) string { return long(o.Volts) })
	s.on(`:CURR `+num, func(p []string) string { o.Limit = number(p[1]); return "" })
	s.on(`:CURR\?`, func([]string) string { return long(o.Limit) })
	s.on(`:VOLT:PROT `+num, func(p []string) string { o.Over, o.Armed = number(p[1]), true; return "" })
	s.on(`:VOLT:PROT\?`, func([]string) string { return long(o.Over) })
	s.on(`:CURR:PROT `+num, func(p []string) string { o.OverCurrent, o.ArmedCurrent = number(p[1]), true; return "" })
	s.on(`:CURR:PROT\?`, func([]string) string { return long(o.OverCurrent) })
	s.on(`:OUTP (ON|OFF)`, func(p []string) string { o.On = p[1] == "ON" && !o.TrippedOver && !o.TrippedAmp; return "" })
	s.on(`:OUTP\?`, func([]string) string { o.look(); return word("1", "0", o.On) })
	s.on(`:OUTP:PROT:TRIP\?`, func([]string) string {
		switch o.look(); {
		case o.TrippedOver:
			return "OVP"
		case o.TrippedAmp:
			return "OCP"
		}
		return "NONE"
	})
	s.on(`:OUTP:PROT:CLE`, func([]string) string { o.clear(false); return "" })
	s.on(`:MEAS:VOLT\?`, func([]string) string { v, _ := o.look(); return long(v) + "V" })
	s.on(`:MEAS:CURR\?`, func([]string) string { _, i := o.look(); return long(i) + "A" })
	return s
}
