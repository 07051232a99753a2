package drivertest

import (
	"fmt"
	"math"
)

// E3632A is the one-output supply of the Keysight E3632A User's Guide: it obeys
// nothing before SYST:REM, answers in long form with CR NL, holds 100
// characters, and a cleared protection restores the output.
func E3632A() *MakerSupply {
	s := newMakerSupply(1, "\r\n")
	s.Most = 100
	o, q, remote := s.Out[0], &queue{none: `+0,"No error"`}, false
	s.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	set := func(pattern string, do func(p []string)) {
		s.on(pattern, func(p []string) string {
			if !remote {
				q.push(`550,"Command not allowed in local"`)
				return ""
			}
			do(p)
			return ""
		})
	}
	s.says(`\*IDN\?`, "HEWLETT-PACKARD,E3632A,0,1.3-5.0-1.0")
	s.says(`\*OPC\?`, "1")
	s.on(`SYST:ERR\?`, q.next)
	s.on(`SYST:REM`, func([]string) string { remote = true; return "" })
	s.on(`SYST:LOC`, func([]string) string { remote = false; return "" })
	s.scpiOutput(set, func() *Output { return o }, true)
	return s
}

// scpiOutput is the SOURce, OUTPut and MEASure trees as the E36xx guides have them.
func (s *MakerSupply) scpiOutput(set func(string, func([]string)), at func() *Output, again bool) {
	set(`VOLT `+num, func(p []string) { at().Volts = number(p[1]) })
	s.on(`VOLT\?`, func([]string) string { return long(at().Volts) })
	set(`CURR `+num, func(p []string) { at().Limit = number(p[1]) })
	s.on(`CURR\?`, func([]string) string { return long(at().Limit) })
	set(`VOLT:PROT `+num, func(p []string) { at().Over = number(p[1]) })
	s.on(`VOLT:PROT\?`, func([]string) string { return long(at().Over) })
	set(`VOLT:PROT:STAT (ON|OFF)`, func(p []string) { at().Armed = p[1] == "ON" })
	s.on(`VOLT:PROT:STAT\?`, func([]string) string { return word("1", "0", at().Armed) })
	s.on(`VOLT:PROT:TRIP\?`, func([]string) string { at().look(); return word("1", "0", at().TrippedOver) })
	set(`VOLT:PROT:CLE`, func([]string) { at().clear(again) })
	set(`CURR:PROT `+num, func(p []string) { at().OverCurrent = number(p[1]) })
	s.on(`CURR:PROT\?`, func([]string) string { return long(at().OverCurrent) })
	set(`CURR:PROT:STAT (ON|OFF)`, func(p []string) { at().ArmedCurrent = p[1] == "ON" })
	s.on(`CURR:PROT:STAT\?`, func([]string) string { return word("1", "0", at().ArmedCurrent) })
	s.on(`CURR:PROT:TRIP\?`, func([]string) string { at().look(); return word("1", "0", at().TrippedAmp) })
	set(`CURR:PROT:CLE`, func([]string) { at().clear(again) })
	set(`OUTP (ON|OFF)`, func(p []string) {
		for _, o := range s.Out {
			o.On = p[1] == "ON" && !o.TrippedOver && !o.TrippedAmp
		}
	})
	s.on(`OUTP\?`, func([]string) string { at().look(); return word("1", "0", at().On) })
	s.on(`MEAS:VOLT\?`, func([]string) string { v, _ := at().look(); return long(v) })
	s.on(`MEAS:CURR\?`, func([]string) string { _, i := at().look(); return long(i) })
}

// E3646A has two outputs, one of which is selected (E364xA guide).
func E3646A() *MakerSupply {
	s := newMakerSupply(2, "\r\n")
	s.Most = 100
	selected, q := s.Out[0], &queue{none: `+0,"No error"`}
	s.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	s.says(`\*IDN\?`, "Agilent Technologies,E3646A,0,1.4-5.0-1.0")
	s.says(`\*OPC\?`, "1")
	s.on(`SYST:ERR\?`, q.next)
	s.takes(`SYST:(REM|LOC)`)
	s.on(`INST:SEL OUT([12])`, func(p []string) string { selected = s.at(p[1]); return "" })
	s.scpiOutput(func(pattern string, do func([]string)) {
		s.on(pattern, func(p []string) string { do(p); return "" })
	}, func() *Output { return selected }, true)
	return s
}

// E36312A takes its channels as a list; one clear takes all latches of a
// channel away and restores it (N6900 guide p. 251).
func E36312A() *MakerSupply {
	s := newMakerSupply(3, "\n")
	q := &queue{none: `+0,"No error"`}
	s.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	const list = `\(@([123])\)`
	s.says(`\*IDN\?`, "Keysight Technologies,E36312A,MY12345678,1.0.3-1.0.4-1.00")
	s.says(`\*OPC\?`, "1")
	s.on(`SYST:ERR\?`, q.next)
	s.on(`VOLT `+num+`,`+list, func(p []string) string { s.at(p[2]).Volts = number(p[1]); return "" })
	s.on(`VOLT\? `+list, func(p []string) string { return long(s.at(p[1]).Volts) })
	s.on(`CURR `+num+`,`+list, func(p []string) string { s.at(p[2]).Limit = number(p[1]); return "" })
	s.on(`CURR\? `+list, func(p []string) string { return long(s.at(p[1]).Limit) })
	s.on(`VOLT:PROT `+num+`,`+list, func(p []string) string { s.at(p[2]).Over, s.at(p[2]).Armed = number(p[1]), true; return "" })
	s.on(`VOLT:PROT\? `+list, func(p []string) string { return long(s.at(p[1]).Over) })
	s.on(`VOLT:PROT:TRIP\? `+list, func(p []string) string { s.at(p[1]).look(); return word("1", "0", s.at(p[1]).TrippedOver) })
	s.on(`OUTP:PROT:CLE `+list, func(p []string) string { s.at(p[1]).clear(true); return "" })
	s.on(`OUTP (ON|OFF),`+list, func(p []string) string { s.at(p[2]).On = p[1] == "ON"; return "" })
	s.on(`OUTP\? `+list, func(p []string) string { s.at(p[1]).look(); return word("1", "0", s.at(p[1]).On) })
	s.on(`MEAS:VOLT\? `+list, func(p []string) string { v, _ := s.at(p[1]).look(); return long(v) })
	s.on(`MEAS:CURR\? `+list, func(p []string) string { _, i := s.at(p[1]).look(); return long(i) })
	return s
}

// HP34401A is the meter of the HP 34401A User's Guide, chapter 4: CONF presets
// all but its range, readings come in long form with CR NL on RS-232, and
// nothing is obeyed there before SYST:REM. Lan makes it a 34461A, which needs no SYST:REM.
func HP34401A(lan bool) *MakerMeter {
	m := newMakerMeter("\r\n", hpVolts, hpAmperes)
	q, remote := &queue{none: `+0,"No error"`}, lan
	m.says(`\*IDN\?`, "HEWLETT-PACKARD,34401A,0,10-5-2")
	if lan {
		m.End, m.rules = "\n", nil
		m.says(`\*IDN\?`, "Agilent Technologies,34461A,MY53200001,A.01.08-02.22-00.08-00.35-01-01")
	} else {
		m.Most = 100
	}
	m.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	m.takes(`\*CLS`)
	m.says(`\*OPC\?`, "1")
	m.on(`SYST:ERR\?`, q.next)
	m.on(`SYST:REM`, func([]string) string { remote = true; return "" })
	m.on(`\*RST`, func([]string) string { m.Current, m.Speed = false, map[bool]string{false: "10", true: "10"}; return "" })
	kind := func(p string) bool { return p == "CURR" }
	m.on(`CONF:(VOLT|CURR):DC(?: `+num+`,DEF)?`, func(p []string) string {
		if !remote {
			q.push(`550,"Command not allowed in local"`)
			return ""
		}
		m.Current = kind(p[1])
		m.Speed[m.Current] = "10"
		if p[2] != "" {
			m.upward(m.Current, number(p[2]))
		}
		return ""
	})
	m.on(`FUNC\?`, func([]string) string { return word(`"CURR"`, `"VOLT"`, m.Current) })
	m.on(`(VOLT|CURR):DC:RANG\?`, func(p []string) string { return long(m.Range[kind(p[1])]) })
	m.on(`(VOLT|CURR):DC:NPLC (0\.02|0\.2|1|10|100)`, func(p []string) string { m.Speed[kind(p[1])] = p[2]; return "" })
	m.on(`(VOLT|CURR):DC:NPLC\?`, func(p []string) string { return long(number(m.Speed[kind(p[1])])) })
	m.on(`READ\?`, func([]string) string { m.integrate(2); return m.reads() })
	m.takes(`SYST:LOC`)
	return m
}

// InfiniiVision is the scope of the 2000X programmer's guide: yorigin in volts
// about reference 128, codes 0, 1 and 255 are flags, blocks with eight digits.
func InfiniiVision() *MakerScope {
	s := newMakerScope(10)
	q := &queue{none: `+0,"No error"`}
	s.unknown = func(m string) { q.push(`-113,"Undefined header"`) }
	points := 1000
	s.says(`\*IDN\?`, "AGILENT TECHNOLOGIES,DSO-X 2024A,MY12345678,02.41.2015102200")
	s.takes(`\*CLS|\*RST|:CHAN[12]:DISP ON|:WAV:POIN:MODE NORM|:TRIG:EDGE:LEV .*`)
	s.says(`\*OPC\?`, "1")
	s.on(`:SYST:ERR\?`, q.next)
	s.takes(`:WAV:UNS ON|:WAV:FORM BYTE|:TRIG:EDGE:SLOP POS|:CHAN[12]:COUP DC|:TRIG:EDGE:SOUR CHAN[12]`)
	s.says(`:WAV:UNS\?`, "1")
	s.says(`:WAV:FORM\?`, "BYTE")
	s.says(`:TRIG:EDGE:SLOP\?`, "POS")
	s.says(`:TRIG:EDGE:SOUR\?`, "CHAN1")
	s.says(`:TRIG:EDGE:LEV\?`, "+4.50000E+00")
	s.says(`:CHAN[12]:COUP\?`, "DC")
	s.vertical(`:CHAN([12]):`, "SCAL", "OFFS", "PROB")
	s.on(`:TIM:SCAL `+decimal, func(p []string) string { s.PerDivision = number(p[1]); return "" })
	s.on(`:TIM:SCAL\?`, func([]string) string { return long(s.PerDivision) })
	s.on(`:WAV:POIN (\d+)`, func(p []string) string { points = int(number(p[1])); return "" })
	s.on(`:WAV:POIN\?`, func([]string) string { return fmt.Sprintf("%+d", points) })
	s.on(`:TRIG:SWE (NORM|AUTO)`, func(p []string) string { s.auto = p[1] == "AUTO"; return "" })
	s.on(`:TRIG:SWE\?`, func([]string) string { return word("AUTO", "NORM", s.auto) })
	s.on(`:SING`, func([]string) string { s.run(); return "" })
	s.on(`:STOP`, func([]string) string { return s.end() })
	s.on(`:OPER:COND\?`, func([]string) string { return word("+8", "+0", s.running) }) // bit 3: run
	s.on(`:WAV:SOUR CHAN([12])`, func(p []string) string { s.Source = int(number(p[1])); return "" })
	s.on(`:WAV:SOUR\?`, func([]string) string { return fmt.Sprint("CHAN", s.Source) })
	step := func() float64 { return s.Scale[s.Source] / 32 }
	s.on(`:WAV:PRE\?`, func([]string) string {
		return fmt.Sprintf("+0,+0,%+d,+1,%+.8E,%+.8E,+0,%+.8E,%+.8E,+128", points, 10*s.PerDivision/float64(points), -5*s.PerDivision, step(), s.Offset[s.Source])
	})
	s.on(`:WAV:DATA\?`, func([]string) string {
		return block(8, s.codes(s.Source, points, func(v float64) float64 { return (v-s.Offset[s.Source])/step() + 128 }, 1, 255))
	})
	s.on(`:MEAS:(DUTY|FREQ|PER|VAV)\? CHAN[12]`, func(p []string) string {
		if math.IsNaN(s.Duty) {
			return "+9.9E+37"
		}
		return long(map[string]float64{"DUTY": 100 * s.Duty, "FREQ": 125, "PER": 8e-3, "VAV": 4.5}[p[1]]) // duty in percent
	})
	return s
}
