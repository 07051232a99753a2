package numeric

import (
	"errors"
	"math"
	"testing"

	"pgregory.net/rapid"
)

func near(t *testing.T, what string, got, want, rel float64) {
	t.Helper()
	if math.IsNaN(got) || math.Abs(got-want) > rel*max(1e-300, math.Abs(want)) {
		t.Errorf("%s: got %.17g, want %.17g", what, got, want)
	}
}

func TestBrentFindsPublishedRoots(t *testing.T) {
	for _, c := range []struct {
		name string
		f    func(float64) float64
		a, b float64
		want float64
	}{
		{"Dottie number, OEIS A003957", func(x float64) float64 { return math.Cos(x) - x }, 0, 1, 0.73908513321516064},
		{"Wallis's cubic x^3-2x-5, OEIS A007493", func(x float64) float64 { return x*x*x - 2*x - 5 }, 2, 3, 2.0945514815423266},
		{"omega constant, OEIS A030178", func(x float64) float64 { return x*math.Exp(x) - 1 }, 0, 1, 0.56714329040978387},
		{"reversed interval", func(x float64) float64 { return x*x - 2 }, 2, 0, math.Sqrt2},
		{"root at an end", func(x float64) float64 { return x - 3 }, 3, 9, 3},
		{"root at the other end", func(x float64) float64 { return x - 9 }, 3, 9, 9},
		{"flat then steep", func(x float64) float64 { return math.Pow(x, 19) - 1e-6 }, 0, 4, math.Pow(1e-6, 1.0/19)},
	} {
		got, err := Brent(c.f, c.a, c.b, 0)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
		}
		near(t, c.name, got, c.want, 1e-14)
	}
}

func TestBrentRefuses(t *testing.T) {
	if _, err := Brent(func(x float64) float64 { return 1 + x*x }, -1, 1, 1e-9); !errors.Is(err, ErrNotBracketed) {
		t.Errorf("same signs: got %v", err)
	}
	if _, err := Brent(math.Sqrt, -1, 1, 1e-9); !errors.Is(err, ErrNotFinite) {
		t.Errorf("not a number at an end: got %v", err)
	}
	nan := func(x float64) float64 {
		if x > 0.1 && x < 0.9 {
			return math.NaN()
		}
		return x - 0.5
	}
	if _, err := Brent(nan, 0, 1, 1e-9); !errors.Is(err, ErrNotFinite) {
		t.Errorf("not a number inside: got %v", err)
	}
}

func TestBrentBeatsBisection(t *testing.T) {
	calls := 0
	f := func(x float64) float64 { calls++; return math.Exp(x) - 10 }
	got, err := Brent(f, 0, 10, 1e-12)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "ln 10", got, math.Ln10, 1e-12)
	if calls > 20 { // bisection would need about 43
		t.Errorf("%d evaluations", calls)
	}
}

func TestOmegaPublishedValues(t *testing.T) {
	for _, c := range []struct{ x, want float64 }{
		{0, 0.56714329040978387},               // omega constant, OEIS A030178
		{1, 1},                                 // w + ln w = 1
		{1 + math.E, math.E},                   // w + ln w = e + 1
		{2 + math.Ln2, 2},                      // w + ln w = 2 + ln 2
		{math.Log(0.1) + 0.1, 0.1},             // the same identity below one
		{math.Log(1e-12) + 1e-12, 1e-12},       // deep in the exponential tail
		{1000 + math.Log(1000), 1000},          // exp(x) overflows here
		{1e20, 1e20 - 46.051701859880914},      // x − ln x
		{math.Inf(1), math.Inf(1)},             // limit
		{-745, math.Exp(-745)},                 // smallest double
		{1 + 1e-9, 1 + 0.5e-9 + 1e-18/16},      // Taylor about 1 (Corless and Jeffrey 2002)
		{math.Log(math.Pi) + math.Pi, math.Pi}, // identity
	} {
		if got := Omega(c.x); got != c.want {
			near(t, "omega", got, c.want, 4e-15)
		}
	}
	if Omega(math.Inf(-1)) != 0 || !math.IsNaN(Omega(math.NaN())) {
		t.Error("omega(-inf) must be 0 and omega(NaN) NaN")
	}
}

func TestOmegaSolvesItsEquation(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		w := math.Exp(rapid.Float64Range(-90, 90).Draw(t, "ln w"))
		x := w + math.Log(w)
		// x carries half a unit in its last place; omega's slope turns that into a relative error of w.
		allow := 4e-15 + 2e-16*math.Abs(x)/(1+w)
		if got := Omega(x); math.Abs(got/w-1) > allow {
			t.Fatalf("omega(%g) = %g, want %g", x, got, w)
		}
	})
}

func TestGaussLegendrePublishedNodes(t *testing.T) {
	// Abramowitz and Stegun, Handbook of Mathematical Functions, table 25.4, n = 2, 3 and 5.
	r := GaussLegendre(3)
	near(t, "node", math.Abs(r.X[0]), 0.774596669241483, 1e-14)
	near(t, "weight", r.W[0], 0.555555555555556, 1e-14)
	near(t, "middle weight", r.W[1], 0.888888888888889, 1e-14)
	near(t, "n = 2", math.Abs(GaussLegendre(2).X[0]), 0.577350269189626, 1e-14)
	near(t, "n = 5", math.Abs(GaussLegendre(5).X[0]), 0.906179845938664, 1e-14)
}

func TestGaussLegendreIntegrates(t *testing.T) {
	r := GaussLegendre(8)
	near(t, "1/x from 1 to 2", r.Integrate(func(x float64) float64 { return 1 / x }, 1, 2), math.Ln2, 1e-11)
	near(t, "reversed", r.Integrate(math.Exp, 1, 0), 1-math.E, 1e-13)
	near(t, "degree 15", r.Integrate(func(x float64) float64 { return math.Pow(x, 15) }, 0, 2), 4096, 1e-12)
	allocs := testing.AllocsPerRun(10, func() { r.Integrate(math.Exp, 0, 1) })
	if allocs != 0 {
		t.Errorf("%v allocations per integral", allocs)
	}
}
