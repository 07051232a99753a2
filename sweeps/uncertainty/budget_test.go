package uncertainty

import (
	"errors"
	"math"
	"testing"

	"pgregory.net/rapid"
)

func TestSharedInstrumentCancelsInDifference(t *testing.T) {
	gain := func(x float64) Component { return Rectangular("meter gain", 0.01).Keyed("meter").Times(x) }
	before := New(9.0, gain(9.0), Scatter("repeats", Value{U: 0.002, DOF: 7}))
	after := New(9.1, gain(9.1), Scatter("repeats", Value{U: 0.002, DOF: 7}))
	d := Difference(after, before)
	want := math.Hypot(0.1*0.01/math.Sqrt(3), 0.002*math.Sqrt2)
	within(t, "u of difference", d.U(), want, 1e-12)
	if r := Correlation(before, after); r < 0.99 {
		t.Errorf("readings of one meter should be nearly fully correlated, r = %g", r)
	}
	within(t, "dof", d.DOF(), 14*math.Pow(want/(0.002*math.Sqrt2), 4), 1e-6)
}

func TestUnkeyedComponentsShareNothing(t *testing.T) {
	a := New(1, Known("noise", 0.1))
	if cov := Covariance(a, a); cov != 0 {
		t.Errorf("covariance %g of causes without a key", cov)
	}
	within(t, "sum", Linear([]float64{1, 1}, a, a).U(), 0.1*math.Sqrt2, 1e-15)
	keyed := New(1, Known("noise", 0.1).Keyed("this record"))
	within(t, "keyed sum", Linear([]float64{1, 1}, keyed, keyed).U(), 0.2, 1e-15)
}

func TestMeanOfTwoRoads(t *testing.T) {
	a, b := New(10, Known("a", 3)), New(12, Known("b", 4))
	m := Mean(a, b)
	within(t, "mean", m.X, (10*16+12*9)/25.0, 1e-12) // inverse-variance weights
	within(t, "u", m.U(), 12/5.0, 1e-12)
	within(t, "disagreement", Disagreement(a, b), 2/5.0, 1e-12)

	shared := Known("range", 5).Keyed("range")
	c, d := New(10, shared), New(12, shared, Known("d", 1))
	if m := Mean(c, d); m.X != 10 {
		t.Errorf("a road that only adds uncertainty must get no weight; mean %g", m.X)
	}
	if m := Mean(c, c); m.X != 10 || m.U() != 5 {
		t.Errorf("a road twice is that road: %g, %g", m.X, m.U())
	}
}

func TestDisagreementOfExactValues(t *testing.T) {
	if d := Disagreement(New(1), New(1)); d != 0 {
		t.Errorf("equal exact values disagree by %g", d)
	}
	if d := Disagreement(New(1), New(2)); !math.IsInf(d, 1) {
		t.Errorf("different exact values disagree by %g", d)
	}
}

func TestRepeats(t *testing.T) {
	v, err := Repeats([]float64{1, 2, 3, 4})
	if err != nil {
		t.Fatal(err)
	}
	within(t, "mean", v.X, 2.5, 0)
	within(t, "u", v.U, math.Sqrt(5.0/3/4), 1e-15)
	within(t, "dof", v.DOF, 3, 0)
	if _, err := Repeats([]float64{1}); !errors.Is(err, ErrTooFew) {
		t.Errorf("one reading: %v", err)
	}
	if _, err := Simultaneous([]float64{1, 2}, []float64{1}); err == nil {
		t.Error("uneven rows must be refused")
	}
	if _, err := Simultaneous([]float64{1}); !errors.Is(err, ErrTooFew) {
		t.Errorf("one row: %v", err)
	}
}

func TestCheck(t *testing.T) {
	good := New(1, Known("a", 0.1))
	if err := good.Check(); err != nil {
		t.Error(err)
	}
	for _, bad := range []Budget{
		New(math.NaN()), New(math.Inf(1)), New(1, Known("a", math.NaN())),
		New(1, Known("a", math.Inf(1))), New(1, Component{Source: "no dof", U: 1, Sensitivity: 1}),
		New(1, Known("a", 1).Times(math.NaN())),
	} {
		if bad.Check() == nil {
			t.Errorf("%+v passed", bad)
		}
	}
}

func TestPropagateLinearIsExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		num := rapid.Float64Range(-100, 100)
		u := rapid.Float64Range(0, 10)
		a := New(num.Draw(t, "a"), Known("a", u.Draw(t, "ua")), Known("s", u.Draw(t, "sa")).Keyed("s"))
		b := New(num.Draw(t, "b"), Known("b", u.Draw(t, "ub")), Known("s", u.Draw(t, "sb")).Keyed("s"))
		f := []float64{num.Draw(t, "fa"), num.Draw(t, "fb")}
		want := Linear(f, a, b)
		got := Propagate(func(x []float64) float64 { return f[0]*x[0] + f[1]*x[1] }, a, b)
		if math.Abs(got.X-want.X) > 1e-9 || math.Abs(got.U()-want.U()) > 1e-6*(1+want.U()) {
			t.Fatalf("propagated %g ± %g, want %g ± %g", got.X, got.U(), want.X, want.U())
		}
	})
}

func TestAddLeavesReceiverAlone(t *testing.T) {
	b := New(1, Known("a", 3))
	c := b.Add(Known("b", 4))
	within(t, "added", c.U(), 5, 1e-15)
	within(t, "original", b.U(), 3, 1e-15)
}
