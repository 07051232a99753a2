package practice

import (
	"encoding/binary"
	"math"
	"strconv"
	"strings"
	"testing"
	"time"

	"nightbench/instruments/practice/circuit"
)

// The aperture beat: readings that begin at random phases, over Ta = 20 ms on 8 V at
// D = 0.25, T = 7 ms, spread by no more than ΔV·D(1−D)·T/Ta, and by a good part of it
// (BENCH-PRACTICE's formula; the wave's mean over a whole number of periods has none).
func TestApertureBeat(t *testing.T) {
	b := steady()
	b.Timing.Period = 7e-3
	atDesk(t, b, func(d *desk) {
		d.on("8")
		d.tell("average", "VOLT:RANG 10;NPLC 1")
		low, high := math.Inf(1), math.Inf(-1)
		for k := range 24 {
			time.Sleep(time.Duration(k*k%7) * 293 * time.Microsecond)
			v := d.number("average", "READ?")
			low, high = min(low, v), max(high, v)
		}
		most := 8 * 0.25 * 0.75 * 7e-3 / 20e-3
		if high-2 > most*1.02 || 2-low > most*1.02 {
			t.Errorf("readings from %g to %g V about 2 V; at most ±%.3g V", low, high, most)
		}
		if high-low < 0.5*most {
			t.Errorf("readings from %g to %g V: no beat to be seen; up to ±%.3g V is right", low, high, most)
		}
		d.tell("average", "VOLT:NPLC 100")
		if v := d.number("average", "READ?"); math.Abs(v-2) > most/100*1.02+10e-3 {
			t.Errorf("100 PLC: %g V; the beat falls with the aperture", v)
		}
	})
}

// Steps: 1 PLC on the 10 V range shows 3 ppm of it, 30 µV; the supply shows 1 mV and 0.1 mA.
func TestQuantisation(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		d.tell("average", "VOLT:RANG 10;NPLC 1")
		whole := func(what string, x, step float64) {
			if k := x / step; math.Abs(k-math.Round(k)) > 1e-3 {
				t.Errorf("%s: %.9g is no multiple of %g", what, x, step)
			}
		}
		for range 5 {
			whole("meter", d.number("average", "READ?"), 30e-6)
			whole("supply volts", d.number("supply", "MEAS:VOLT?"), 1e-3)
			whole("supply amperes", d.number("supply", "MEAS:CURR?"), 0.1e-3)
		}
	})
}

// Beyond 120 % of the range the meter says 9.9E37, of the mean's sign.
func TestMeterOverload(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		d.tell("average", "VOLT:RANG 1;NPLC 10")
		if got := d.ask("average", "READ?"); got != "+9.90000000E+37" {
			t.Errorf("2 V on the 1 V range: %s", got)
		}
		d.tell("average", "VOLT:RANG 10")
		d.near("2 V on the 10 V range", d.number("average", "READ?"), 2, 10e-3)
	})
}

// The preamble turns codes into volts at the tip and instants from the trigger.
func TestRecord(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		d.tell("scope", "SENS1:VOLT:RANG:UPP 10;LOW -2;:SENS2:VOLT:RANG:UPP 10;LOW -2;:SENS:SWE:POIN 1000;TIME 5ms;:TRIG:SOUR CH2;LEV 4;SLOP POS;:INIT")
		if got := d.ask("scope", "*OPC?"); got != "1" {
			t.Fatalf("*OPC? %q", got)
		}
		var p [5]float64
		for i, f := range strings.Split(d.ask("scope", "TRAC:PRE? CH2"), ",") {
			p[i], _ = strconv.ParseFloat(f, 64)
		}
		if p[0] != 1000 || math.Abs(p[1]-5e-6) > 1e-12 || p[2] > -0.49e-3 || p[2] < -0.51e-3 || p[3] != 12.0/250 || p[4] != 4 {
			t.Errorf("preamble %v: 1000 points of 5 µs from a tenth before the trigger, 12 V over 250 codes about 4 V", p)
		}
		d.tell("scope", "TRAC? CH2")
		block := d.hear("scope", time.Second)
		if !strings.HasPrefix(block, "#42000") || len(block) != 6+2000+1 {
			t.Fatalf("a block of %d bytes, %.6q", len(block), block)
		}
		volts := func(i int) float64 {
			return float64(int16(binary.BigEndian.Uint16([]byte(block[6+2*i:]))))*p[3] + p[4]
		}
		first, mean := -p[2]/p[1], 0.0
		before, after := volts(int(first)-2), volts(int(math.Ceil(first))+2)
		if before > 4 || after < 4 {
			t.Errorf("%g V just before the trigger and %g V after it; it rises through 4 V there", before, after)
		}
		for i := range 1000 {
			mean += volts(i) / 1000
		}
		d.near("mean of load_lo over five periods", mean, 0.75*8, 0.02*8+0.01*12) // the stated 2 % and 1 % of the screen
	})
}

// No trigger: *OPC? is held back until ABOR, which is obeyed at once and leaves no record.
func TestAbortDuringHeldCompletion(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.tell("scope", "TRIG:SOUR CH1;LEV 4;:INIT") // the output is off: nothing rises
		d.tell("scope", "*OPC?")
		if got := d.hear("scope", 5*time.Second); got != "" {
			t.Errorf("*OPC? answered %q without a trigger", got)
		}
		d.tell("scope", "ABOR")
		if got := d.hear("scope", 100*time.Millisecond); got != "1\n" {
			t.Errorf("after ABOR came %q", got)
		}
		d.tell("scope", "TRAC? CH1")
		if e := d.ask("scope", "SYST:ERR?"); !strings.HasPrefix(e, "-230,") {
			t.Errorf("a record that never was: %s", e)
		}
	})
}

// Constant current: the board really starves, and bit 0 of the condition says so.
func TestCurrentLimit(t *testing.T) {
	b := steady()
	b.Timing.Duty = 1 - 1e-9 // 100 Ω across the supply for good
	atDesk(t, b, func(d *desk) {
		d.tell("supply", "CURR 0.04;:VOLT 8;:OUTP ON")
		time.Sleep(time.Second)
		if got := d.ask("supply", "STAT:QUES:COND?"); got != "1" {
			t.Errorf("condition %s, expected 1: constant current", got)
		}
		d.near("volts at 40 mA into 100 Ω beside a bleeder of 470 Ω", d.number("supply", "MEAS:VOLT?"), 0.04*100*470/570, 0.05)
		d.tell("supply", "CURR 1")
		time.Sleep(time.Second)
		if got := d.ask("supply", "STAT:QUES:COND?"); got != "2" {
			t.Errorf("condition %s, expected 2: constant voltage", got)
		}
	})
}

// Over-voltage latches the output off and holds it off until cleared.
func TestOverVoltageLatch(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		d.tell("supply", "VOLT:PROT 6")
		time.Sleep(100 * time.Millisecond)
		if got := d.ask("supply", "OUTP?;:VOLT:PROT:TRIP?"); got != "0;1" {
			t.Errorf("OUTP?;TRIP? %s", got)
		}
		d.tell("supply", "OUTP ON")
		if e := d.ask("supply", "SYST:ERR?"); !strings.HasPrefix(e, "-221,") {
			t.Errorf("OUTP ON while latched: %s", e)
		}
	})
}

// Off is not zero at once: 1 mF beside 470 Ω falls with a time constant near half a second.
func TestOutputFallsSlowly(t *testing.T) {
	b := steady()
	b.Source.Bulk, b.Load.Resistance = 1e-3, 1e6
	atDesk(t, b, func(d *desk) {
		d.on("8")
		d.tell("supply", "OUTP OFF")
		off := d.clock.Elapsed()
		time.Sleep(200 * time.Millisecond)
		v := d.number("supply", "MEAS:VOLT?")
		at := (d.clock.Elapsed() - off).Seconds() - supplyAperture/2
		d.near("volts after the output went off", v, 8*math.Exp(-at/0.47), 0.25)
		for range 10 {
			time.Sleep(300 * time.Millisecond)
			v = d.number("supply", "MEAS:VOLT?")
		}
		if v > 0.05 {
			t.Errorf("after seven time constants still %g V", v)
		}
	})
}

// A capacitor 10 % larger: the frequency falls by 9 ± 0.5 %, by the scope's own samples.
func TestLargerCapacitor(t *testing.T) {
	atDesk(t, timed(), func(d *desk) {
		d.on("9")
		before := d.frequency()
		if err := d.Alter(func(b *circuit.Board) { b.Timing.Capacitance *= 1.1 }); err != nil {
			t.Fatal(err)
		}
		time.Sleep(100 * time.Millisecond)
		d.near("fall of the frequency, %", 100*(1-d.frequency()/before), 9.09, 0.5)
	})
}

// Every answer takes time, and it is bench time: n times faster at pace n.
func TestAnswersTakeTime(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		for name, least := range map[string]time.Duration{"supply": 1500 * time.Microsecond, "average": 1500 * time.Microsecond, "scope": 2 * time.Millisecond, "pot": 500 * time.Microsecond} {
			began := time.Now()
			d.ask(name, "*IDN?")
			if took := time.Since(began); took < least || took > time.Second {
				t.Errorf("%s answered in %s", name, took)
			}
		}
	})
}
