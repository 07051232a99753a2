package circuit

import (
	"fmt"
	"math"
	"testing"
)

// chopped is a motor on an ideal switch, as motor.csv has it. The table gives
// no inertia: this one makes the mechanical time constant tau seconds.
func chopped(r, l, k, coulomb, viscous, vf, period, duty, tau float64) Board {
	return Board{
		Source: stiff, Timer: ideal(1),
		Timing:  Timing{Network: Clocked, Period: period, Duty: duty},
		Driver:  Driver{Stage: NMOS},
		Flyback: &Diode{Knee: vf},
		Load: Load{
			Kind: Motor, Resistance: r, Inductance: l, Constant: k,
			StaticTorque: coulomb, CoulombTorque: coulomb, ViscousTorque: viscous, Inertia: tau * k * k / r,
		},
	}
}

// TestMotorAgainstTransientSimulation holds every row of motor.csv.
func TestMotorAgainstTransientSimulation(t *testing.T) {
	for k, r := range rows(t, "motor.csv") {
		t.Run(fmt.Sprint("row", k+1), func(t *testing.T) {
			n := func(key string) float64 { return number(t, r, key) }
			period := n("period")
			tau := math.Max(0.05, 20*period)
			b := chopped(n("r"), n("l"), n("k"), n("t_coulomb"), n("b_viscous"), n("v_freewheel"), period, n("duty"), tau)
			s := mustNew(t, b, n("v_on"))
			s.x.Speed, s.turning = n("speed")*0.97, true
			s.Advance(math.Round(100*tau/period) * period)
			end := s.Now() + 20*period
			i := NewMean(Through(LoadCurrent), s.Now(), end)
			v := NewMean(Between(LoadHi, LoadLo), s.Now(), end)
			w := NewMean(RotorSpeed(), s.Now(), end)
			if err := s.Run(end, i, v, w); err != nil {
				t.Fatal(err)
			}
			t.Logf("i %+.3f %%, v %+.3f %%, speed %+.3f %%", 100*(i.Value()/n("i_avg")-1), 100*(v.Value()/n("v_avg")-1), 100*(w.Value()/n("speed")-1))
			near(t, "i_avg", i.Value(), n("i_avg"), 0.003)
			near(t, "v_avg", v.Value(), n("v_avg"), 0.003)
			near(t, "speed", w.Value(), n("speed"), 0.003)
		})
	}
}

// TestBoardAgainstTransientSimulation holds board.csv: the whole circuit with
// transistor models on the other side, one saturation voltage on ours (about
// 0.1 V at these currents, as the table's README says).
func TestBoardAgainstTransientSimulation(t *testing.T) {
	for k, r := range rows(t, "board.csv") {
		t.Run(fmt.Sprint("row", k+1), func(t *testing.T) {
			n := func(key string) float64 { return number(t, r, key) }
			timer := ideal(15)
			timer.Drop = Levels{{9, []Point{{0, 0.6}, {1, 6.6}}}}
			timer.Low = Levels{{9, []Point{{0, 0}, {1, 10}}}}
			b := Board{
				Source: stiff, Timer: timer,
				Timing: Timing{Network: Steered, Common: n("r1"), Down: n("r2"), Capacitance: n("c"), ChargeDiode: &signal, DischargeDiode: &signal},
				Driver: Driver{Stage: NPN, Saturation: 0.05, Resistance: 0.7, BaseResistor: n("rb"), Vbe: 0.75}, Flyback: &rectifier,
				Load: Load{
					Kind: Motor, Resistance: n("r"), Inductance: n("l"), Constant: n("k"),
					StaticTorque: n("t_coulomb"), CoulombTorque: n("t_coulomb"), ViscousTorque: n("b_viscous"),
					Inertia: 0.05 * n("k") * n("k") / n("r"),
				},
			}
			s := mustNew(t, b, n("vcc"))
			s.x.Speed, s.turning = n("speed"), true
			s.Advance(4)
			high, low := phases(t, s, 0.03)
			period := high + low
			t0, t1 := s.Now(), s.Now()+20*period
			i := NewMean(Through(LoadCurrent), t0, t1)
			v := NewMean(Between(LoadHi, LoadLo), t0, t1)
			o := NewMean(Between(TimerOut, Common), t0, t1)
			is := NewMean(Through(SupplyCurrent), t0, t1)
			if err := s.Run(t1, i, v, o, is); err != nil {
				t.Fatal(err)
			}
			for _, c := range []struct {
				what string
				got  float64
			}{
				{"duty", high / period}, {"frequency", 1 / period}, {"motor_current", i.Value()}, {"motor_voltage", v.Value()},
				{"speed", s.State().Speed}, {"supply_current", is.Value()}, {"output_average", o.Value()},
			} {
				t.Logf("%s %+.3f %%", c.what, 100*(c.got/n(c.what)-1))
				near(t, c.what, c.got, n(c.what), 0.015)
			}
		})
	}
}
