package drivertest

import (
	"fmt"
	"math"
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
