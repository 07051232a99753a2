package practice

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"testing"
	"time"

	"nightbench/instruments/practice/circuit"
)

// Repeats of a reading scatter by the meter's noise, which falls with the root of the aperture.
func TestScatter(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.Alter(func(b *circuit.Board) { b.Timing.Duty = 0.999999 })
		d.on("8")
		scatter := func(nplc string) float64 {
			d.tell("average", "VOLT:RANG 10;NPLC "+nplc)
			sum, squares, n := 0.0, 0.0, 60.0
			for range int(n) {
				x := d.number("average", "READ?") - 8
				sum, squares = sum+x, squares+x*x
			}
			return math.Sqrt((squares - sum*sum/n) / (n - 1))
		}
		one, hundred := scatter("1"), scatter("100")
		// 0.5 ppm of 10 V at 1 PLC, and a display step of 30 µV (rms of rounding 30/√12).
		want := math.Hypot(5e-6, 30e-6/math.Sqrt(12))
		if one < want/2 || one > want*2 || hundred > one/2 {
			t.Errorf("scatter %.3g V at 1 PLC, %.3g V at 100 PLC; about %.2g V and less than half were expected", one, hundred, want)
		}
	})
}

// A change of range costs 30 ms and another aperture each way.
func TestAutorangeDelay(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		took := func() time.Duration {
			began := d.clock.Elapsed()
			d.number("average", "READ?")
			return d.clock.Elapsed() - began
		}
		d.tell("average", "VOLT:NPLC 1;RANG 1000;RANG:AUTO ON")
		first, second := took(), took() // from 1000 V straight to 10 V, then no change
		d.near("reading without a change of range, s", second.Seconds(), 0.042, 2e-3)
		d.near("reading with one, s", first.Seconds(), 0.042+0.030+0.040, 4e-3)
		d.near("the range in force", d.number("average", "VOLT:RANG?"), 10, 0)
	})
}

// A wave that is fine by its mean and too high by its peak is overload: 8 V at 5 % is 0.4 V.
func TestSaturationByPeak(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.Alter(func(b *circuit.Board) { b.Timing.Duty = 0.05 })
		d.on("8")
		d.tell("average", "VOLT:RANG 1;NPLC 10")
		if v := d.number("average", "READ?"); v != 9.9e37 {
			t.Errorf("on the 1 V range it reads %g V of a mean of 0.4 V with peaks of 8 V", v)
		}
		d.tell("average", "VOLT:RANG 10")
		d.near("on the 10 V range", d.number("average", "READ?"), 0.4, 5e-3)
	})
}

// Without auto-zero the zero wanders as the meter warms up; ZERO:AUTO ONCE takes it off.
func TestZeroDrift(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.tell("average", "VOLT:RANG 10;NPLC 100;:ZERO:AUTO OFF;:ZERO:AUTO ONCE")
		before := d.number("average", "READ?")
		time.Sleep(time.Hour)
		after := d.number("average", "READ?")
		drift := math.Abs(after - before)
		if drift < 5e-6 || drift > 200e-6 {
			t.Errorf("drift of the zero in an hour: %.3g V of at most 20 ppm of 10 V", drift)
		}
		d.tell("average", "ZERO:AUTO ONCE")
		d.near("after a new zero", d.number("average", "READ?"), before, 8e-6)
	})
}

// The 10 mA range has 10 Ω in series where the others have 0.1 Ω: the load feels it.
func TestBurdenOfTheRange(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.Alter(func(b *circuit.Board) { b.Load.Resistance, b.Timing.Duty = 1000, 0.999999 })
		d.on("8")
		d.tell("motor", "CURR:RANG 0.1")
		wide := d.number("motor", "READ?")
		d.tell("motor", "CURR:RANG 0.01")
		d.near("share left on the 10 mA range", d.number("motor", "READ?")/wide, 1000/1009.9, 3e-4)
	})
}

// A meter on the timing capacitor loads it; in series with a megohm it reads 10/11.
func TestInputResistance(t *testing.T) {
	period := func(probe circuit.Probe) (p float64) {
		atDesk(t, timed(), func(d *desk) {
			d.tell("pot", "WIP 256")
			d.on("9")
			p = 1 / d.frequency()
		}, func(c *Config) { c.Meters[0].Probe = probe })
		return p
	}
	if with, without := period(circuit.Between(circuit.Capacitor, circuit.Common)), period(circuit.Between(circuit.Supply, circuit.Common)); with > without*0.9995 {
		// 10 MΩ beside the discharge path of 100 kΩ takes about 1 % of the low time.
		t.Errorf("period %.6g s with the meter on the capacitor, %.6g s without: it was to shorten it", with, without)
	}
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		d.tell("average", "VOLT:RANG 10")
		d.near("through 1 MΩ", d.number("average", "READ?"), 2*10./11, 3e-3)
	}, func(c *Config) { c.Meters[0].Series = 1e6 })
}

// The winding cold, off, by ohms; overload with the board alive; copper when it is warm.
func TestOhms(t *testing.T) {
	atDesk(t, pump(), func(d *desk) {
		d.tell("average", `FUNC "RES"`)
		d.near("winding and leads", d.number("average", "READ?"), 12.1, 0.01)
		d.on("9")
		if v := d.number("average", "READ?"); v != 9.9e37 {
			t.Errorf("on a live board it reads %g Ω", v)
		}
	})
}

// The motor warms up and takes less current: copper, 0.39 %/K (handbook value).
func TestWarmUpDrift(t *testing.T) {
	b := pump()
	b.Load.ThermalResistance, b.Load.ThermalCapacity = 15, 8
	atDesk(t, b, func(d *desk) {
		d.tell("pot", "WIP 10")
		d.on("9")
		d.bring(Fault{Kind: RotorLocked})
		d.tell("motor", "CURR:RANG 1;NPLC 10")
		cold := d.number("motor", "READ?")
		time.Sleep(20 * time.Minute) // ten time constants of 120 s
		warm := d.number("motor", "READ?")
		fall := 1 - warm/cold
		if fall < 0.05 || fall > 0.4 {
			t.Errorf("locked current %.4g A cold, %.4g A warm: it fell by %.1f %%", cold, warm, 100*fall)
		}
		t.Logf("locked current %.4g A cold, %.4g A warm", cold, warm)
	})
}

// The board's own warming and the room move the frequency, and the thermometer says so.
func TestClimate(t *testing.T) {
	atDesk(t, timed(), func(d *desk) {
		t0, _ := strconv.ParseFloat(d.ask("probe", "TEMP?"), 64)
		d.near("the room, °C", t0, 20, 0.4)
		d.on("9")
		before := d.frequency()
		time.Sleep(time.Hour)
		t1, _ := strconv.ParseFloat(d.ask("probe", "TEMP?"), 64)
		d.near("after an hour, °C", t1-t0, 10, 0.3)
		// The capacitor alone: −1000 ppm/K over 10 K raises the frequency by 1 %; the diodes' drop adds to it.
		if rise := d.frequency()/before - 1; rise < 0.010 || rise > 0.025 {
			t.Errorf("frequency moved by %.3f %%", 100*rise)
		}
	}, func(c *Config) {
		c.Probe = true
		c.Climate = Climate{Room: 293.15, Rise: 10, Tau: 300, CapacitorPerKelvin: -1000e-6}
	})
}

// The motor starts at a higher setting than the one at which it stalls.
func TestHysteresisOfStartAndStall(t *testing.T) {
	atDesk(t, pump(), func(d *desk) {
		d.tell("average", "VOLT:RANG 10;NPLC 10")
		d.tell("supply", "CURR 1")
		turning := func(millivolts int) bool {
			d.tell("supply", fmt.Sprintf("VOLT %d mV", millivolts))
			time.Sleep(5 * time.Second)
			var speed float64
			d.world.do(func(s *circuit.Sim) { speed = s.State().Speed })
			return speed > 1
		}
		d.Alter(func(b *circuit.Board) {
			b.Timing = circuit.Timing{Network: circuit.Clocked, Period: 1e-3, Duty: 1}
			b.Timer.MinSupply = 0.1
			b.Driver.GateLevel = 0
		})
		d.tell("supply", "OUTP ON")
		start, stall := 0, 0
		for mv := 200; mv < 3000 && start == 0; mv += 25 {
			if turning(mv) {
				start = mv
			}
		}
		for mv := start; mv > 0 && stall == 0; mv -= 25 {
			if !turning(mv) {
				stall = mv
			}
		}
		// Static torque 0.6 mN m over K = 8 mV s/rad is 75 mA through 12.35 Ω: 0.93 V; Coulomb torque alone 0.62 V.
		d.near("start, V", float64(start)/1e3, 0.93, 0.05)
		d.near("stall, V", float64(stall)/1e3, 0.62, 0.06)
	})
}

// Over-current for more than 50 ms latches, and holds until cleared.
func TestOverCurrentLatch(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.tell("supply", "CURR:PROT 0.5;PROT:STAT ON")
		d.on("8")
		if got := d.ask("supply", "CURR:PROT:TRIP?;:OUTP?"); got != "0;1" {
			t.Errorf("at 20 mA: %s", got)
		}
		d.bring(Fault{Kind: Short, Size: 4})
		time.Sleep(200 * time.Millisecond)
		if got := d.ask("supply", "CURR:PROT:TRIP?;:OUTP?"); got != "1;0" {
			t.Errorf("at 1 A: %s", got)
		}
		d.Lift(Short, "")
		d.tell("supply", "CURR:PROT:CLE")
		if got := d.ask("supply", "CURR:PROT:TRIP?;:OUTP?"); got != "0;1" {
			t.Errorf("cleared, the output is as it was before: %s", got)
		}
	})
}

// Nobody talks for 10 s: the output goes off, and stays so.
func TestCommunicationWatchdog(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.tell("supply", "OUTP:PROT:WDOG:DEL 10;:OUTP:PROT:WDOG ON")
		d.on("8")
		for range 5 {
			time.Sleep(8 * time.Second)
			if got := d.ask("supply", "OUTP?"); got != "1" {
				t.Fatalf("asked every 8 s: %s", got)
			}
		}
		d.tell("average", "VOLT:RANG 10")
		time.Sleep(9 * time.Second)
		d.near("9 s after the last word", d.number("average", "READ?"), 2, 0.01)
		time.Sleep(3 * time.Second)
		d.near("12 s after", d.number("average", "READ?"), 0, 0.01)
		if got := d.ask("supply", "OUTP?;:OUTP:PROT:WDOG:TRIP?"); got != "0;1" {
			t.Errorf("%s", got)
		}
		d.tell("supply", "OUTP:PROT:CLE")
		if got := d.ask("supply", "OUTP?;:OUTP:PROT:WDOG:TRIP?"); got != "1;0" {
			t.Errorf("cleared: %s", got)
		}
		var off float64
		for _, l := range strings.Split(d.log.String(), "\n") {
			if strings.Contains(l, `"output":false`) {
				fmt.Sscanf(l[strings.Index(l, `"bench":`):], `"bench":%f`, &off)
			}
		}
		if off == 0 {
			t.Error("the log does not say that the output went off")
		}
	})
}

// Without a trigger an automatic one comes; normal mode waits for ever.
func TestTriggerModes(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		d.tell("scope", "TRIG:SOUR CH2;LEV 50;:INIT")
		time.Sleep(time.Minute)
		if s := d.ask("scope", "TRIG:STAT?"); s != "WAIT" {
			t.Errorf("normal mode after a minute: %s", s)
		}
		d.tell("scope", "ABOR")
		d.tell("scope", "TRIG:ATR ON;:INIT")
		time.Sleep(time.Second)
		if s := d.ask("scope", "TRIG:STAT?"); s != "AUTO" {
			t.Errorf("automatic mode after a second: %s", s)
		}
		d.tell("scope", "SENS2:VOLT:RANG:LOW -1;UPP 10;:TRIG:LEV 4;:INIT")
		if s := d.ask("scope", "*OPC?;:TRIG:STAT?"); s != "1;TD" {
			t.Errorf("with a crossing: %s", s)
		}
	})
}

// AC coupling takes the mean away, and a slow wave sags: 10 Hz, τ = 15.9 ms.
func TestCouplings(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.on("8")
		d.tell("scope", "SENS2:VOLT:RANG:LOW -10;UPP 10;:SENS:SWE:POIN 10000;TIME 10ms;:INP2:COUP AC;:INIT")
		d.near("mean, AC coupled", d.number("scope", "MEAS:VAV? CH2"), 0, 0.3)
		d.near("swing, AC coupled", d.number("scope", "MEAS:VPP? CH2"), 8, 0.8)
		d.tell("scope", "INP2:COUP GND;:INIT")
		d.near("swing, grounded", d.number("scope", "MEAS:VPP? CH2"), 0, 0.4)
		d.tell("scope", "INP2:COUP DC;:INIT")
		d.near("mean, DC coupled", d.number("scope", "MEAS:VAV? CH2"), 6, 0.5) // load_lo is high for three quarters
	})
}

// A step through a bandwidth of 1 MHz rises in 0.35 µs (t = 0.35/B for one pole, textbook).
func TestBandwidth(t *testing.T) {
	y := make([]float64, 4000)
	for i := 100; i < len(y); i++ {
		y[i] = 1
	}
	const interval = 1e-9
	lowPass(y, interval, 1e6)
	lo, hi := 0, 0
	for i, v := range y {
		if v < 0.1 {
			lo = i
		}
		if v < 0.9 {
			hi = i
		}
	}
	if rise := float64(hi-lo) * interval; math.Abs(rise/0.35e-6-1) > 0.02 {
		t.Errorf("10 to 90 %% in %.4g s, expected 0.35 µs", rise)
	}
}

// A finer converter, same screen: the step falls to a sixteenth, and clipping stays clipping.
func TestTwelveBits(t *testing.T) {
	step := func(bits int) (v float64) {
		atDesk(t, steady(), func(d *desk) {
			d.tell("scope", "INIT")
			pre := strings.Split(d.ask("scope", "TRAC:PRE? CH1"), ",")
			v, _ = strconv.ParseFloat(pre[3], 64)
			d.tell("scope", "SENS1:VOLT:RANG:LOW 1;UPP 2;:INIT")
			if got := d.number("scope", "MEAS:VMIN? CH1"); got < 0.9 || got > 1 {
				t.Errorf("%d bits: 0 V far below the screen reads %g V", bits, got)
			}
		}, func(c *Config) { c.Scope.Bits = bits })
		return v
	}
	if coarse, fine := step(8), step(12); math.Abs(coarse/fine-16) > 1e-6 {
		t.Errorf("steps %g V and %g V", coarse, fine)
	}
}

// What the built-in measurements say of 1 kHz at a duty of 0.25, and where there is nothing.
func TestBuiltInMeasurements(t *testing.T) {
	for _, c := range []struct {
		kind  Scope
		duty  float64
		token string
	}{{Scope{}, 0.75, "9.91E37"}, {Scope{Percent: true, NoValue: "****"}, 75, "****"}} {
		atDesk(t, steady(), func(d *desk) {
			d.on("8")
			d.tell("scope", "SENS2:VOLT:RANG:LOW -2;UPP 10;:SENS:SWE:POIN 10000;TIME 10ms;:INIT")
			d.near("frequency", d.number("scope", "MEAS:FREQ? CH2"), 1000, 1)
			d.near("pulse width", d.number("scope", "MEAS:PWID? CH2"), 0.75e-3, 2e-6)
			d.near("duty", d.number("scope", "MEAS:PDUT? CH2"), c.duty, c.duty*0.003)
			d.near("duty by its other name", d.number("scope", "MEAS:DCYC? CH2"), c.duty, c.duty*0.003)
			if got := d.ask("scope", "MEAS:FREQ? CH3"); got != c.token {
				t.Errorf("frequency of an open channel: %q, expected %q", got, c.token)
			}
			d.tell("scope", "SENS:SWE:TIME 0.5ms;:INIT")
			if got := d.ask("scope", "MEAS:PER? CH2"); got != c.token {
				t.Errorf("period in a record of half a period: %q", got)
			}
		}, func(cfg *Config) { cfg.Scope = c.kind })
	}
}
