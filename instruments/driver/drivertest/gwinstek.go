package drivertest

import (
	"strconv"
	"time"
)

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

// GDM8261A is the meter of the GDM-8261A manual (p. 163): it rounds a range to
// the nearest, wants exactly one space after a header, and here ends its replies in LF CR.
func GDM8261A() *MakerMeter {
	m := newMakerMeter("\n\r", hpVolts, hpAmperes)
	q := &queue{none: `+0,"No error"`}
	m.unknown = func(string) { q.push(`-102,"Syntax error"`) }
	kind := func(p string) bool { return p == "CURR" }
	m.says(`\*IDN\?`, "GWInstek,GDM8261A,GEQ123456,1.03")
	m.takes(`\*CLS|SYST:LOC`)
	m.says(`\*OPC\?`, "1")
	m.on(`SYST:ERR\?`, q.next)
	rate := "S"
	m.on(`\*RST`, func([]string) string { m.Current, rate = false, "S"; return "" })
	m.on(`CONF:(VOLT|CURR):DC(?: `+num+`)?`, func(p []string) string {
		if m.Current = kind(p[1]); p[2] != "" {
			m.nearest(m.Current, number(p[2]))
		}
		return ""
	})
	m.on(`CONF:FUNC\?`, func([]string) string { return word("DCI", "DCV", m.Current) })
	m.on(`CONF:RANG\?`, func([]string) string { return strconv.FormatFloat(m.Range[m.Current], 'g', 6, 64) })
	m.on(`SENS:DET:RATE ([SMF])`, func(p []string) string { rate = p[1]; return "" })
	m.on(`SENS:DET:RATE\?`, func([]string) string { return rate })
	m.on(`READ\?`, func([]string) string { return m.reads() })
	return m
}
