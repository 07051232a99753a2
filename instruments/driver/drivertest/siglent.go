package drivertest

import (
	"fmt"
	"math"
	"strings"
	"time"
)

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

// SDM3055 is the meter of the SDM3055 Remote Manual.
func SDM3055() *MakerMeter {
	m := newMakerMeter("\n", twoVolts, twoAmperes)
	q := &queue{none: `+0,"No error"`}
	m.unknown = func(string) { q.push(`-113,"Undefined header"`) }
	kind := func(p string) bool { return p == "CURR" }
	m.says(`\*IDN\?`, "Siglent Technologies,SDM3055,SDM35FAC5R0104,1.01.01.19")
	m.takes(`\*CLS|SYST:LOC`)
	m.says(`\*OPC\?`, "1")
	m.on(`SYST:ERR\?`, q.next)
	m.on(`\*RST`, func([]string) string { m.Current, m.Speed = false, map[bool]string{false: "10", true: "10"}; return "" })
	m.on(`CONF:(VOLT|CURR):DC`, func(p []string) string { m.Current = kind(p[1]); return "" })
	m.on(`FUNC\?`, func([]string) string { return word(`"CURR"`, `"VOLT"`, m.Current) })
	m.on(`(VOLT|CURR):DC:RANG `+num, func(p []string) string { m.upward(kind(p[1]), number(p[2])); return "" })
	m.on(`(VOLT|CURR):DC:RANG\?`, func(p []string) string { return long(m.Range[kind(p[1])]) })
	m.on(`(VOLT|CURR):DC:NPLC (0\.3|1|10)`, func(p []string) string { m.Speed[kind(p[1])] = p[2]; return "" })
	m.on(`(VOLT|CURR):DC:NPLC\?`, func(p []string) string { return long(number(m.Speed[kind(p[1])])) })
	m.on(`READ\?`, func([]string) string { m.integrate(2); return m.reads() })
	return m
}

// SDS1104XE is the scope of the SDS1104X-E programming guide (pp. 84, 142), in
// the older language: header and unit until CHDR OFF, 25 codes a division,
// signed; two NL follow a block.
func SDS1104XE() *MakerScope {
	s := newMakerScope(14)
	heads := true
	tell := func(header, value, unit string) string {
		if heads {
			return header + " " + value + unit
		}
		return value
	}
	s.on(`\*IDN\?`, func([]string) string {
		return tell("*IDN", "Siglent Technologies,SDS1104X-E,SDSMMEBQ2R1234,8.2.6.1.37R9", "")
	})
	s.on(`\*OPC\?`, func([]string) string { return tell("*OPC", "1", "") })
	s.on(`CHDR OFF`, func([]string) string { heads = false; return "" })
	s.takes(`\*RST|MSIZ 7K|WFSU SP,0,NP,0,FP,0|C[12]:(TRA ON|CPL D1M|TRSL POS)|C[12]:TRLV .*|TRSE EDGE,SR,C[12],HT,OFF|TRMD SINGLE`)
	fixedAnswer := func(pattern, header, value string) {
		s.on(pattern, func(p []string) string { return tell(strings.ReplaceAll(header, "#", p[len(p)-1]), value, "") })
	}
	fixedAnswer(`C([12]):CPL\?`, "C#:CPL", "D1M")
	fixedAnswer(`C([12]):TRSL\?`, "C#:TRSL", "POS")
	fixedAnswer(`TRSE\?`, "TRSE", "EDGE,SR,C1,HT,OFF")
	fixedAnswer(`TRMD\?`, "TRMD", "SINGLE")
	s.on(`C([12]):TRLV\?`, func(p []string) string { return tell("C"+p[1]+":TRLV", "4.50E+00", "V") })
	for name, c := range map[string]struct {
		of   map[int]float64
		unit string
	}{"VDIV": {s.Scale, "V"}, "OFST": {s.Offset, "V"}, "ATTN": {s.Probe, ""}} {
		s.on(`C([12]):`+name+` `+decimal, func(p []string) string { c.of[int(number(p[1]))] = number(p[2]); return "" })
		s.on(`C([12]):`+name+`\?`, func(p []string) string {
			return tell("C"+p[1]+":"+name, fmt.Sprintf("%.2E", c.of[int(number(p[1]))]), c.unit)
		})
	}
	s.on(`TDIV `+decimal, func(p []string) string { s.PerDivision = number(p[1]); return "" })
	s.on(`TDIV\?`, func([]string) string { return tell("TDIV", fmt.Sprintf("%.2E", s.PerDivision), "S") })
	s.on(`TRDL\?`, func([]string) string { return tell("TRDL", "-0.00E+00", "S") })
	s.on(`SARA\?`, func([]string) string { return tell("SARA", fmt.Sprintf("%.2E", 7000/14/s.PerDivision), "Sa/s") })
	s.on(`ARM`, func([]string) string { s.run(); return "" })
	s.on(`STOP`, func([]string) string { return s.end() })
	s.on(`FRTR`, func([]string) string { s.trigger(); return "" })
	s.on(`SAST\?`, func([]string) string { return tell("SAST", word("Ready", "Stop", s.running), "") })
	s.on(`C([12]):WF\? DAT2`, func(p []string) string {
		n := int(number(p[1]))
		data := s.codes(n, 7000, func(v float64) float64 { return (v + s.Offset[n]) * 25 / s.Scale[n] }, -128, 127)
		return word("C"+p[1]+":WF ALL,", "DAT2,", heads) + block(9, data) + "\n"
	})
	s.on(`C([12]):PAVA\? (DUTY|FREQ|PER|MEAN)`, func(p []string) string {
		value := map[string]string{"DUTY": fmt.Sprintf("%.2f%%", 100*s.Duty), "FREQ": "1.25E+02Hz", "PER": "8.0E-3S", "MEAN": "4.50E+00V"}[p[2]]
		if math.IsNaN(s.Duty) {
			value = "****"
		}
		return word("C"+p[1]+":PAVA ", "", heads) + p[2] + "," + value
	})
	return s
}
