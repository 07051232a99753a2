package si

import (
	"fmt"
	"strings"
)

// Quantity is a value in SI of one dimension. The zero value is zero.
type Quantity[D dimension] struct{ x float64 }

// The quantities in use.
type (
	Voltage         = Quantity[volt]
	Current         = Quantity[ampere]
	Resistance      = Quantity[ohm]
	Capacitance     = Quantity[farad]
	Inductance      = Quantity[henry]
	Time            = Quantity[second]
	Frequency       = Quantity[hertz]
	Power           = Quantity[watt]
	Ratio           = Quantity[one]
	Temperature     = Quantity[celsius]
	TorqueConstant  = Quantity[voltSecPerRad]
	Torque          = Quantity[newtonMetre]
	ViscousTorque   = Quantity[newtonMetreSec]
	QuadraticTorque = Quantity[newtonMetreSq]
	Inertia         = Quantity[kilogramMetre2]
)

// of makes a quantity from its SI value.
func of[D dimension](x float64) Quantity[D] { return Quantity[D]{x} }

// Volts makes a voltage from its value in V.
func Volts(x float64) Voltage { return of[volt](x) }

// Amperes makes a current from its value in A.
func Amperes(x float64) Current { return of[ampere](x) }

// Ohms makes a resistance from its value in Ω.
func Ohms(x float64) Resistance { return of[ohm](x) }

// Farads makes a capacitance from its value in F.
func Farads(x float64) Capacitance { return of[farad](x) }

// Henries makes a inductance from its value in H.
func Henries(x float64) Inductance { return of[henry](x) }

// Seconds makes a time from its value in s.
func Seconds(x float64) Time { return of[second](x) }

// Watts makes a power from its value in W.
func Watts(x float64) Power { return of[watt](x) }

// Ratios makes a plain ratio from its value in 1.
func Ratios(x float64) Ratio { return of[one](x) }

// DegreesCelsius makes a temperature from its value in °C.
func DegreesCelsius(x float64) Temperature { return of[celsius](x) }

// SI is the value in the unit of its dimension.
func (q Quantity[D]) SI() float64 { return q.x }

// Unit is the unit of the dimension.
func (q Quantity[D]) Unit() Unit { var d D; return d.spec().unit }

// String prints the value with an engineering prefix and its unit: "4.7 kΩ".
func (q Quantity[D]) String() string { return Format(q.x, q.Unit()) }

// MarshalText writes what UnmarshalText reads.
func (q Quantity[D]) MarshalText() ([]byte, error) { return []byte(q.String()), nil }

// UnmarshalText reads a quantity as people write it. Its error says what would do.
func (q *Quantity[D]) UnmarshalText(b []byte) error {
	var d D
	x, err := parse(string(b), d.spec())
	if err != nil {
		return err
	}
	q.x = x
	return nil
}

// Toleranced is a nominal value with a relative tolerance: "4k7 1%", "5 mH 20% normal".
// The tolerance is the half-width of a rectangular distribution, or with the
// word normal twice the standard deviation of a normal one.
type Toleranced[D dimension] struct {
	Nominal   Quantity[D]
	Tolerance float64 // relative half-width
	Normal    bool
}

// Exactly is a nominal value without tolerance.
func Exactly[D dimension](q Quantity[D]) Toleranced[D] { return Toleranced[D]{Nominal: q} }

// SI is the nominal value.
func (t Toleranced[D]) SI() float64 { return t.Nominal.x }

// Spread gives nominal value, relative tolerance and whether the distribution is
// normal, whatever the dimension.
func (t Toleranced[D]) Spread() (nominal, tolerance float64, normal bool) {
	return t.Nominal.x, t.Tolerance, t.Normal
}

// String writes nominal and tolerance as UnmarshalText reads them.
func (t Toleranced[D]) String() string {
	s := t.Nominal.String()
	if t.Tolerance != 0 {
		s += fmt.Sprintf(" %.6g%%", t.Tolerance*100)
	}
	if t.Normal {
		s += " normal"
	}
	return s
}

// MarshalText writes what UnmarshalText reads.
func (t Toleranced[D]) MarshalText() ([]byte, error) { return []byte(t.String()), nil }

// UnmarshalText reads "4k7", "4k7 1%" or "4k7 1% normal".
func (t *Toleranced[D]) UnmarshalText(b []byte) error {
	var d D
	sp := d.spec()
	f := strings.Fields(string(b))
	var out Toleranced[D]
	if n := len(f); n > 1 && (f[n-1] == "normal" || f[n-1] == "rectangular") {
		out.Normal = f[n-1] == "normal"
		f = f[:n-1]
	}
	if n := len(f); n > 1 && strings.HasSuffix(f[n-1], "%") && f[n-1] != "%" {
		tol, err := number(strings.TrimSuffix(f[n-1], "%"))
		if err != nil || tol < 0 || tol >= 100 {
			return fmt.Errorf("%q is no tolerance; write %s with its tolerance like %q", f[n-1], sp.kind, sp.like+" 5%")
		}
		out.Tolerance = tol / 100
		f = f[:n-1]
	}
	x, err := parse(strings.Join(f, " "), sp)
	if err != nil {
		return err
	}
	out.Nominal.x = x
	*t = out
	return nil
}

// Toleranced values in use.
type (
	TolVoltage         = Toleranced[volt]
	TolCurrent         = Toleranced[ampere]
	TolResistance      = Toleranced[ohm]
	TolCapacitance     = Toleranced[farad]
	TolInductance      = Toleranced[henry]
	TolTime            = Toleranced[second]
	TolRatio           = Toleranced[one]
	TolTorqueConstant  = Toleranced[voltSecPerRad]
	TolTorque          = Toleranced[newtonMetre]
	TolViscousTorque   = Toleranced[newtonMetreSec]
	TolQuadraticTorque = Toleranced[newtonMetreSq]
	TolInertia         = Toleranced[kilogramMetre2]
)
