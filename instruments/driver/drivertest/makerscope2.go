package drivertest

import (
	"fmt"
	"math"
	"strings"
)

// TDS2024B is the scope of the TDS200/1000/2000 programmer manual: replies have
// headers until HEAD OFF, errors are a list of events that *ESR? releases, with
// positive codes, the position counts in divisions, *OPC? is held back.
func TDS2024B() *MakerScope {
	s := newMakerScope(10)
	heads, released, waiting := true, []string{}, []string{}
	s.unknown = func(m string) { waiting = append(waiting, `113,"Undefined header; `+m+`"`) }
	s.takes(`\*CLS|\*RST|SEL:CH[12] ON|DAT:(ENC RIB|WID 1|STAR 1|STOP 2500)|ACQ:STOPA SEQ|TRIG:MAI:LEV .*|MEASU:IMM:SOU CH[12]`)
	s.on(`HEAD OFF`, func([]string) string { heads = false; return "" })
	head := func(name, value string) string {
		if heads {
			return ":" + name + " " + value
		}
		return value
	}
	answer := func(pattern, name string, value func(p []string) string) {
		s.on(pattern, func(p []string) string { return head(name, value(p)) })
	}
	is := func(v string) func([]string) string { return func([]string) string { return v } }
	s.says(`\*IDN\?`, "TEKTRONIX,TDS 2024B,0,CF:91.1CT FV:v22.16")
	s.holdOPC()
	answer(`HEAD\?`, "HEADER", is("0"))
	s.on(`\*ESR\?`, func([]string) string { released, waiting = append(released, waiting...), nil; return "0" })
	s.on(`EVM\?`, func([]string) string {
		switch {
		case len(released) > 0:
			e := released[0]
			released = released[1:]
			return e
		case len(waiting) > 0:
			return `1,"No events to report - new events pending *ESR?"`
		}
		return `0,"No events to report - queue empty"`
	})
	s.takes(`CH[12]:COUP DC|TRIG:MAI:EDGE:(SOU CH[12]|SLO RIS)`)
	answer(`CH[12]:COUP\?`, "CH1:COUPLING", is("DC"))
	answer(`TRIG:MAI:EDGE:SOU\?`, "TRIGGER:MAIN:EDGE:SOURCE", is("CH1"))
	answer(`TRIG:MAI:EDGE:SLO\?`, "TRIGGER:MAIN:EDGE:SLOPE", is("RISE"))
	answer(`TRIG:MAI:LEV\?`, "TRIGGER:MAIN:LEVEL", is("4.5E0"))
	s.vertical(`CH([12]):`, "SCA", "POS", "PRO")
	s.on(`HOR:MAI:SCA `+decimal, func(p []string) string { s.PerDivision = number(p[1]); return "" })
	answer(`HOR:MAI:SCA\?`, "HORIZONTAL:MAIN:SCALE", func([]string) string { return fmt.Sprintf("%.1E", s.PerDivision) })
	s.on(`TRIG:MAI:MOD (NORM|AUTO)`, func(p []string) string { s.auto = p[1] == "AUTO"; return "" })
	answer(`TRIG:MAI:MOD\?`, "TRIGGER:MAIN:MODE", func([]string) string { return word("AUTO", "NORMAL", s.auto) })
	s.on(`ACQ:STATE RUN`, func([]string) string { s.run(); return "" })
	s.on(`ACQ:STATE STOP`, func([]string) string { return s.end() })
	s.on(`DAT:SOU CH([12])`, func(p []string) string { s.Source = int(number(p[1])); return "" })
	answer(`DAT:SOU\?`, "DATA:SOURCE", func([]string) string { return fmt.Sprint("CH", s.Source) })
	mult := func() float64 { return s.Scale[s.Source] / 25 }
	for name, value := range map[string]func() float64{
		"XINCR": func() float64 { return 10 * s.PerDivision / 2500 }, "PT_OFF": func() float64 { return 1250 }, "XZERO": func() float64 { return 0 },
		"YMULT": mult, "YOFF": func() float64 { return 25 * s.Offset[s.Source] }, "YZERO": func() float64 { return 0 },
	} {
		answer(`WFMPRE:`+name+`\?`, "WFMPRE:"+name, func([]string) string { return fmt.Sprintf("%.6E", value()) })
	}
	s.on(`CURV\?`, func([]string) string {
		return block(4, s.codes(s.Source, 2500, func(v float64) float64 { return v/mult() + 25*s.Offset[s.Source] }, -128, 127))
	})
	kind := "FREQ"
	s.on(`MEASU:IMM:TYP (FREQ|PERI|PWI|MEAN)`, func(p []string) string { kind = p[1]; return "" })
	s.on(`MEASU:IMM:VAL\?`, func([]string) string {
		if math.IsNaN(s.Duty) {
			waiting = append(waiting, `2225,"Measurement error, No waveform to measure"`)
			return "9.9E37"
		}
		return fmt.Sprintf("%.4E", map[string]float64{"FREQ": 125, "PERI": 8e-3, "PWI": 8e-3 * s.Duty, "MEAN": 4.5}[kind])
	})
	return s
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
