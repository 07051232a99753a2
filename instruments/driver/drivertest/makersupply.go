package drivertest

import (
	"fmt"
	"time"
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

// DP832 is the Rigol DP800 of its programming guide: the channel is the first
// parameter, answers are words. With ones it answers 1 and 0, as a DP2000.
func DP832(ones bool) *MakerSupply {
	s := newMakerSupply(3, "\n")
	q := &queue{none: `0,"No error"`}
	s.unknown = func(string) { q.push(`-113,"Undefined header; keyword cannot be found"`) }
	onOff, yesNo := [2]string{"ON", "OFF"}, [2]string{"YES", "NO"}
	if ones {
		onOff, yesNo = [2]string{"1", "0"}, [2]string{"1", "0"}
	}
	say := func(w [2]string, is bool) string { return word(w[0], w[1], is) }
	s.says(`\*IDN\?`, "RIGOL TECHNOLOGIES,DP832,DP8A123456789,00.01.14")
	s.says(`\*OPC\?`, "1")
	s.on(`:SYST:ERR\?`, q.next)
	s.on(`:SOUR([123]):VOLT `+num, func(p []string) string { s.at(p[1]).Volts = number(p[2]); return "" })
	s.on(`:SOUR([123]):VOLT\?`, func(p []string) string { return fixed(3, s.at(p[1]).Volts) })
	s.on(`:SOUR([123]):CURR `+num, func(p []string) string { s.at(p[1]).Limit = number(p[2]); return "" })
	s.on(`:SOUR([123]):CURR\?`, func(p []string) string { return fixed(4, s.at(p[1]).Limit) })
	s.on(`:OUTP CH([123]),(ON|OFF)`, func(p []string) string { s.at(p[1]).On = p[2] == "ON"; return "" })
	s.on(`:OUTP\? CH([123])`, func(p []string) string { s.at(p[1]).look(); return say(onOff, s.at(p[1]).On) })
	s.on(`:OUTP:OVP:VAL CH([123]),`+num, func(p []string) string { s.at(p[1]).Over = number(p[2]); return "" })
	s.on(`:OUTP:OVP:VAL\? CH([123])`, func(p []string) string { return fixed(3, s.at(p[1]).Over) })
	s.on(`:OUTP:OVP CH([123]),(ON|OFF)`, func(p []string) string { s.at(p[1]).Armed = p[2] == "ON"; return "" })
	s.on(`:OUTP:OVP\? CH([123])`, func(p []string) string { return say(onOff, s.at(p[1]).Armed) })
	s.on(`:OUTP:OVP:QUES\? CH([123])`, func(p []string) string { s.at(p[1]).look(); return say(yesNo, s.at(p[1]).TrippedOver) })
	s.on(`:OUTP:O[VC]P:CLE CH([123])`, func(p []string) string { s.at(p[1]).clear(false); return "" })
	s.on(`:OUTP:OCP:VAL CH([123]),`+num, func(p []string) string { s.at(p[1]).OverCurrent = number(p[2]); return "" })
	s.on(`:OUTP:OCP:VAL\? CH([123])`, func(p []string) string { return fixed(4, s.at(p[1]).OverCurrent) })
	s.on(`:OUTP:OCP CH([123]),(ON|OFF)`, func(p []string) string { s.at(p[1]).ArmedCurrent = p[2] == "ON"; return "" })
	s.on(`:OUTP:OCP\? CH([123])`, func(p []string) string { return say(onOff, s.at(p[1]).ArmedCurrent) })
	s.on(`:OUTP:OCP:QUES\? CH([123])`, func(p []string) string { s.at(p[1]).look(); return say(yesNo, s.at(p[1]).TrippedAmp) })
	s.on(`:OUTP:MODE\? CH([123])`, func(p []string) string {
		if o := s.at(p[1]); !o.On {
			return "UR"
		}
		return word("CC", "CV", s.at(p[1]).limiting())
	})
	s.on(`:MEAS:VOLT\? CH([123])`, func(p []string) string { v, _ := s.at(p[1]).look(); return fixed(4, v) })
	s.on(`:MEAS:CURR\? CH([123])`, func(p []string) string { _, i := s.at(p[1]).look(); return fixed(4, i) })
	return s
}

// SPD3303X has the channel as a prefix and its state as hexadecimal text
// (QuickStart p. 27; PSD7303 manual p. 39): bits 0 and 1 constant current, 4 and 5 on.
func SPD3303X() *MakerSupply {
	s := newMakerSupply(2, "\n")
	s.Least = 10 * time.Millisecond
	q := &queue{none: "0  No Error"}
	s.unknown = func(string) { q.push("1  Unknown Command") }
	s.says(`\*IDN\?`, "Siglent Technologies,SPD3303X,SPD00001130025,1.01.01.01.02,V3.0")
	s.on(`SYST:ERR\?`, q.next)
	s.on(`CH([12]):VOLT `+num, func(p []string) string { s.at(p[1]).Volts = number(p[2]); return "" })
	s.on(`CH([12]):VOLT\?`, func(p []string) string { return fixed(3, s.at(p[1]).Volts) })
	s.on(`CH([12]):CURR `+num, func(p []string) string { s.at(p[1]).Limit = number(p[2]); return "" })
	s.on(`CH([12]):CURR\?`, func(p []string) string { return fixed(3, s.at(p[1]).Limit) })
	s.on(`OUTP CH([12]),(ON|OFF)`, func(p []string) string { s.at(p[1]).On = p[2] == "ON"; return "" })
	s.on(`SYST:STAT\?`, func([]string) string {
		bits := 0
		for n, o := range s.Out {
			if o.limiting() {
				bits |= 1 << n
			}
			if o.On {
				bits |= 1 << (4 + n)
			}
		}
		return fmt.Sprintf("0x%x", bits)
	})
	s.on(`MEAS:VOLT\? CH([12])`, func(p []string) string { v, _ := s.at(p[1]).look(); return fixed(3, v) })
	s.on(`MEAS:CURR\? CH([12])`, func(p []string) string { _, i := s.at(p[1]).look(); return fixed(3, i) })
	return s
}
