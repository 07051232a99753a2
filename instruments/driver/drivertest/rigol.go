package drivertest

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"time"
)

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

// DM3058 is the meter of the DM3058 Programming Guide: three command sets,
// ranges by number, speeds by letter (F, M, S: 123, 20 and 2.5 readings a second).
func DM3058() *MakerMeter {
	m := newMakerMeter("\n", twoVolts, twoAmperes)
	own := false
	kind := func(p string) bool { return p == "CURR" }
	m.says(`\*IDN\?`, "Rigol Technologies,DM3058,DM3L123456789,01.01.00.02.02.00")
	m.on(`CMDSET RIGOL`, func([]string) string { own = true; return "" })
	m.on(`\*RST`, func([]string) string { m.Current, m.Speed = false, map[bool]string{false: "S", true: "S"}; return "" })
	m.on(`:FUNC:(VOLT|CURR):DC`, func(p []string) string { m.Current = own && kind(p[1]); return "" })
	m.on(`:FUNC\?`, func([]string) string { return word("DCI", "DCV", m.Current) })
	m.on(`:MEAS:(VOLT|CURR):DC ([0-5])`, func(p []string) string {
		m.Range[kind(p[1])] = m.Ranges[kind(p[1])][int(number(p[2]))]
		return ""
	})
	m.on(`:MEAS:(VOLT|CURR):DC:RANG\?`, func(p []string) string {
		return strconv.Itoa(slices.Index(m.Ranges[kind(p[1])], m.Range[kind(p[1])]))
	})
	m.on(`:RATE:(VOLT|CURR):DC ([FMS])`, func(p []string) string { m.Speed[kind(p[1])] = p[2]; return "" })
	m.on(`:RATE:(VOLT|CURR):DC\?`, func(p []string) string {
		if kind(p[1]) != m.Current {
			return "" // valid only while that function is active
		}
		return m.Speed[m.Current]
	})
	m.on(`:MEAS:(VOLT|CURR):DC\?`, func(p []string) string {
		m.Current = kind(p[1])
		time.Sleep(map[string]time.Duration{"F": 8130 * time.Microsecond, "M": 50 * time.Millisecond, "S": 400 * time.Millisecond}[m.Speed[m.Current]])
		return strings.ToLower(m.reads())
	})
	return m
}

// DS1054Z is the scope of the DS1000Z programming guide: the preamble's yorigin
// counts in codes, the offset is added to the signal, *OPC? is answered 0 while
// busy, and a record is read between two sample numbers.
func DS1054Z() *MakerScope {
	s := newMakerScope(12)
	q := &queue{none: `0,"No error"`}
	s.unknown = func(m string) { q.push(`-113,"Undefined header; keyword cannot be found"`) }
	first, last := 1, 1200
	s.says(`\*IDN\?`, "RIGOL TECHNOLOGIES,DS1054Z,DS1ZA123456789,00.04.04.SP3")
	s.takes(`\*CLS|\*RST|:CHAN[12]:DISP ON|:TRIG:EDGE:LEV .*`)
	s.on(`\*OPC\?`, func([]string) string { return word("0", "1", s.running) })
	s.on(`:SYST:ERR\?`, q.next)
	s.takes(`:WAV:MODE NORM|:WAV:FORM BYTE|:TRIG:EDGE:SLOP POS|:CHAN[12]:COUP DC|:TRIG:EDGE:SOUR CHAN[12]`)
	s.says(`:WAV:MODE\?`, "NORM")
	s.says(`:WAV:FORM\?`, "BYTE")
	s.says(`:TRIG:EDGE:SLOP\?`, "POS")
	s.says(`:TRIG:EDGE:SOUR\?`, "CHAN1")
	s.says(`:TRIG:EDGE:LEV\?`, "4.500000e+00")
	s.says(`:CHAN[12]:COUP\?`, "DC")
	s.vertical(`:CHAN([12]):`, "SCAL", "OFFS", "PROB")
	s.on(`:TIM:MAIN:SCAL `+decimal, func(p []string) string { s.PerDivision = number(p[1]); return "" })
	s.on(`:TIM:MAIN:SCAL\?`, func([]string) string { return fmt.Sprintf("%.7e", s.PerDivision) })
	s.on(`:TRIG:SWE (NORM|AUTO)`, func(p []string) string { s.auto = p[1] == "AUTO"; return "" })
	s.on(`:TRIG:SWE\?`, func([]string) string { return word("AUTO", "NORM", s.auto) })
	s.on(`:SING`, func([]string) string { s.run(); return "" })
	s.on(`:STOP`, func([]string) string { return s.end() })
	s.on(`:TRIG:STAT\?`, func([]string) string { return word("WAIT", "STOP", s.running) })
	s.on(`:WAV:SOUR CHAN([12])`, func(p []string) string { s.Source = int(number(p[1])); return "" })
	s.on(`:WAV:SOUR\?`, func([]string) string { return fmt.Sprint("CHAN", s.Source) })
	s.on(`:WAV:(STAR|STOP) (\d+)`, func(p []string) string {
		*map[string]*int{"STAR": &first, "STOP": &last}[p[1]] = int(number(p[2]))
		return ""
	})
	s.on(`:WAV:(STAR|STOP)\?`, func(p []string) string { return fmt.Sprint(map[string]int{"STAR": first, "STOP": last}[p[1]]) })
	step := func() float64 { return s.Scale[s.Source] / 25 }
	origin := func() float64 { return math.Round(s.Offset[s.Source] / step()) }
	s.on(`:WAV:PRE\?`, func([]string) string {
		return fmt.Sprintf("0,0,1200,1,%.6e,%.6e,0,%.6e,%.0f,127", s.PerDivision/100, -6*s.PerDivision, step(), origin())
	})
	s.on(`:WAV:DATA\?`, func([]string) string {
		data := s.codes(s.Source, 1200, func(v float64) float64 { return v/step() + origin() + 127 }, 0, 255)
		return block(9, data[first-1:last])
	})
	s.on(`:MEAS:ITEM\? (PDUT|FREQ|PER|VAVG),CHAN[12]`, func(p []string) string {
		if math.IsNaN(s.Duty) {
			return "9.9e37"
		}
		return fmt.Sprintf("%.6e", map[string]float64{"PDUT": s.Duty, "FREQ": 125, "PER": 8e-3, "VAVG": 4.5}[p[1]]) // duty as a ratio
	})
	return s
}
