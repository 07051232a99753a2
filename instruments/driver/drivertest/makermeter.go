package drivertest

import (
	"math"
	"slices"
	"strconv"
	"strings"
	"time"
)

// MakerMeter is a multimeter of some maker's on a steady input.
type MakerMeter struct {
	Maker
	Volts, Amperes float64            // at its terminals
	Current        bool               // it measures current
	Ranges         map[bool][]float64 // full scales, by Current
	Range          map[bool]float64   // in force
	Speed          map[bool]string    // in force, as its manual writes it
}

func newMakerMeter(end string, volts, amperes []float64) *MakerMeter {
	return &MakerMeter{Maker: Maker{End: end}, Ranges: map[bool][]float64{false: volts, true: amperes},
		Range: map[bool]float64{false: volts[len(volts)-1], true: amperes[len(amperes)-1]}, Speed: map[bool]string{}}
}

// reads is a reading in the form SD.DDDDDDDDESDD; beyond 120 % of the range it is 9.9E37.
func (m *MakerMeter) reads() string {
	x := m.Volts
	if m.Current {
		x = m.Amperes
	}
	if math.Abs(x) > 1.2*m.Range[m.Current] {
		return long(math.Copysign(9.9e37, x))
	}
	return long(x)
}

// upward takes the next range up.
func (m *MakerMeter) upward(current bool, x float64) {
	for _, r := range m.Ranges[current] {
		if r >= x*(1-1e-9) {
			m.Range[current] = r
			return
		}
	}
}

// nearest takes the nearest range, as the GDM-8261A does (p. 163: 2 V gives 10 V).
func (m *MakerMeter) nearest(current bool, x float64) {
	m.Range[current] = slices.MinFunc(m.Ranges[current], func(a, b float64) int {
		return int(1e3 * (math.Abs(math.Log(a/x)) - math.Abs(math.Log(b/x))))
	})
}

var (
	hpVolts, hpAmperes = []float64{0.1, 1, 10, 100, 1000}, []float64{0.01, 0.1, 1, 3}
	// of a meter with full scales of two
	twoVolts, twoAmperes = []float64{0.2, 2, 20, 200, 1000}, []float64{200e-6, 2e-3, 20e-3, 0.2, 2, 10}
)

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

// integrate takes the time of a reading with so many apertures, in periods of 50 Hz.
func (m *MakerMeter) integrate(apertures float64) {
	time.Sleep(time.Duration(apertures * number(m.Speed[m.Current]) / 50 * float64(time.Second)))
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
