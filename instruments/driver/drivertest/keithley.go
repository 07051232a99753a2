package drivertest

import (
	"slices"
)

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

// K2000 is the meter of the Keithley 2000 User's Manual, chapter 4: the
// function is a quoted string, and READ? is refused while it triggers itself.
func K2000() *MakerMeter {
	m := newMakerMeter("\n", hpVolts, hpAmperes)
	q, continuous := &queue{none: `0,"No error"`}, true
	m.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	kind := func(p string) bool { return p == "CURR" }
	m.says(`\*IDN\?`, "KEITHLEY INSTRUMENTS INC., MODEL 2000, 1234567, A20/A02")
	m.takes(`\*CLS|:SYST:(REM|LOC)`)
	m.says(`\*OPC\?`, "1")
	m.on(`:SYST:ERR\?`, q.next)
	m.on(`\*RST`, func([]string) string {
		m.Current, continuous, m.Speed = false, true, map[bool]string{false: "10", true: "10"}
		return ""
	})
	m.on(`:INIT:CONT (ON|OFF)`, func(p []string) string { continuous = p[1] == "ON"; return "" })
	m.on(`:FUNC "(VOLT|CURR):DC"`, func(p []string) string { m.Current = kind(p[1]); return "" })
	m.on(`:FUNC\?`, func([]string) string { return word(`"CURR:DC"`, `"VOLT:DC"`, m.Current) })
	m.on(`:(VOLT|CURR):DC:RANG `+num, func(p []string) string { m.upward(kind(p[1]), number(p[2])); return "" })
	m.on(`:(VOLT|CURR):DC:RANG\?`, func(p []string) string { return fixed(6, m.Range[kind(p[1])]) })
	m.on(`:(VOLT|CURR):DC:NPLC `+num, func(p []string) string { m.Speed[kind(p[1])] = p[2]; return "" })
	m.on(`:(VOLT|CURR):DC:NPLC\?`, func(p []string) string { return fixed(2, number(m.Speed[kind(p[1])])) })
	m.on(`:READ\?`, func([]string) string {
		if continuous {
			q.push(`-213,"Init ignored"`)
			return ""
		}
		m.integrate(2)
		return m.reads()
	})
	return m
}

// K2110 is the meter of the 2110 Reference (pp. 3-3, 5-13).
func K2110() *MakerMeter {
	m := newMakerMeter("\n", hpVolts, append(slices.Clone(hpAmperes), 10))
	q := &queue{none: `0,"No error"`}
	m.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	kind := func(p string) bool { return p == "CURR" }
	m.says(`\*IDN\?`, "KEITHLEY INSTRUMENTS INC.,MODEL 2110,8002123,02.03-03-20")
	m.takes(`\*CLS`)
	m.says(`\*OPC\?`, "1")
	m.on(`SYST:ERR\?`, q.next)
	m.on(`\*RST`, func([]string) string { m.Current, m.Speed = false, map[bool]string{false: "10", true: "10"}; return "" })
	m.on(`FUNC "(VOLT|CURR):DC"`, func(p []string) string { m.Current = kind(p[1]); return "" })
	m.on(`FUNC\?`, func([]string) string { return word(`"CURR"`, `"VOLT"`, m.Current) })
	m.on(`(VOLT|CURR):DC:RANG `+num, func(p []string) string { m.upward(kind(p[1]), number(p[2])); return "" })
	m.on(`(VOLT|CURR):DC:RANG\?`, func(p []string) string { return long(m.Range[kind(p[1])]) })
	m.on(`(VOLT|CURR):DC:NPLC `+num, func(p []string) string { m.Speed[kind(p[1])] = p[2]; return "" })
	m.on(`(VOLT|CURR):DC:NPLC\?`, func(p []string) string { return long(number(m.Speed[kind(p[1])])) })
	m.on(`READ\?`, func([]string) string { m.integrate(2); return m.reads() })
	return m
}
