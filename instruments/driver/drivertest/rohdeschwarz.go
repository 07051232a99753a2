package drivertest

import (
	"fmt"
	"math"
	"strings"
)

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

// RTB2004 is the scope of the RTB2000 manual (pp. 339-345): linear codes about
// 127.5, the scaling asked field by field, *OPC? held back. It can't be told a
// probe's factor in the lines known of it. Real makes its samples REAL,32.
func RTB2004(realSamples bool) *MakerScope {
	s := newMakerScope(12)
	q := &queue{none: `0,"No error"`}
	s.unknown = func(m string) { q.push(`-113,"Undefined header"`) }
	points := 10000
	s.says(`\*IDN\?`, "Rohde&Schwarz,RTB2004,1333.1005k04/101234,02.300")
	s.holdOPC()
	s.takes(`\*CLS|\*RST|CHAN:DATA:POIN MAX|CHAN[12]:STAT ON|TRIG:A:LEV[12] .*|CHAN[12]:COUP DCL|TRIG:A:(SOUR CH[12]|EDGE:SLOP POS)`)
	s.on(`SYST:ERR\?`, q.next)
	format := "ASC"
	s.on(`FORM (UINT,8|REAL|ASC)`, func(p []string) string { format = p[1]; return "" })
	s.on(`FORM\?`, func([]string) string { return format })
	s.says(`CHAN[12]:COUP\?`, "DCL")
	s.says(`TRIG:A:SOUR\?`, "CH1")
	s.says(`TRIG:A:EDGE:SLOP\?`, "POS")
	s.says(`TRIG:A:LEV[12]\?`, "4.5")
	s.vertical(`CHAN([12]):`, "SCAL", "OFFS", "none")
	s.on(`TIM:SCAL `+decimal, func(p []string) string { s.PerDivision = number(p[1]); return "" })
	s.on(`TIM:SCAL\?`, func([]string) string { return fmt.Sprintf("%.2E", s.PerDivision) })
	s.on(`ACQ:POIN (\d+)`, func(p []string) string { points = int(number(p[1])); return "" })
	s.on(`ACQ:POIN\?`, func([]string) string { return fmt.Sprint(points) })
	s.on(`TRIG:A:MODE (NORM|AUTO)`, func(p []string) string { s.auto = p[1] == "AUTO"; return "" })
	s.on(`TRIG:A:MODE\?`, func([]string) string { return word("AUTO", "NORM", s.auto) })
	s.on(`SING`, func([]string) string { s.run(); return "" })
	s.on(`STOP`, func([]string) string { return s.end() })
	step := func(n int) float64 { return 8 * s.Scale[n] / 255 }
	at := func(p []string) int { return int(number(p[1])) }
	s.on(`CHAN([12]):DATA:HEAD\?`, func([]string) string {
		return fmt.Sprintf("%.6E,%.6E,%d,1", -6*s.PerDivision, 6*s.PerDivision, points)
	})
	s.on(`CHAN([12]):DATA:XINC\?`, func([]string) string { return fmt.Sprintf("%.6E", 12*s.PerDivision/float64(points)) })
	s.on(`CHAN([12]):DATA:XOR\?`, func([]string) string { return fmt.Sprintf("%.6E", -6*s.PerDivision) })
	s.on(`CHAN([12]):DATA:YINC\?`, func(p []string) string { return fmt.Sprintf("%.9E", step(at(p))) })
	s.on(`CHAN([12]):DATA:YOR\?`, func(p []string) string { return fmt.Sprintf("%.9E", s.Offset[at(p)]-127.5*step(at(p))) })
	s.on(`CHAN([12]):DATA\?`, func(p []string) string {
		n := at(p)
		codes := s.codes(n, points, func(v float64) float64 { return (v-s.Offset[n])/step(n) + 127.5 }, 0, 255)
		if !realSamples {
			return block(len(fmt.Sprint(points)), codes)
		}
		volts := make([]string, len(codes))
		for i, c := range codes {
			volts[i] = fmt.Sprintf("%.4E", s.Offset[n]+(float64(c)-127.5)*step(n))
		}
		return strings.Join(volts, ",")
	})
	kind := "FREQ"
	s.on(`MEAS1:SOUR CH[12]`, func([]string) string { return "" })
	s.on(`MEAS1:MAIN (PDCY|FREQ|PER|MEAN)`, func(p []string) string { kind = p[1]; return "" })
	s.on(`MEAS1:RES\?`, func([]string) string {
		if math.IsNaN(s.Duty) {
			return "9.91E37"
		}
		return fmt.Sprintf("%.4E", map[string]float64{"PDCY": 100 * s.Duty, "FREQ": 125, "PER": 8e-3, "MEAN": 4.5}[kind])
	})
	return s
}
