package uncertainty

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func within(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if math.IsNaN(got) || math.Abs(got-want) > tol {
		t.Errorf("%s: got %.9g, want %.9g within %g", what, got, want, tol)
	}
}

// JCGM 100:2008 H.1: calibration of an end gauge of 50 mm, in nm. The dof 16.7
// and u 32 nm are the standard's; 31.664, 16.752 and 25.447 are recomputed from its inputs.
func TestEndGaugeH1(t *testing.T) {
	difference := New(215, Scatter("repeats", Value{U: 5.8, DOF: 24}),
		Scatter("comparator, random", Value{U: 3.9, DOF: 5}), Scatter("comparator, systematic", Value{U: 6.7, DOF: 8}))
	within(t, "u(d)", difference.U(), 9.6819, 1e-4)
	within(t, "dof of d", difference.DOF(), 25.447, 1e-3)

	standard := New(50000623, Known("certificate of the standard", 25))
	standard.Components[0].DOF = 18
	expansion := New(11.5e-6, Rectangular("expansion of the standard", 2e-6))
	expansionDiff := New(0, Rectangular("difference of expansion", 1e-6))
	expansionDiff.Components[0].DOF = JudgedDOF(0.10)
	warmth := New(0, Rectangular("difference of temperature", 0.05))
	warmth.Components[0].DOF = JudgedDOF(0.50)
	bed := New(-0.1, Known("mean temperature of the bed", 0.2), Arcsine("cycling of the bed", 0.5))
	within(t, "u of bed temperature", bed.U(), 0.41, 0.005) // H.1.3.4

	length := Propagate(func(x []float64) float64 {
		return x[0] + x[1] - x[0]*(x[3]*x[5]+x[2]*x[4])
	}, standard, difference, expansion, expansionDiff, warmth, bed)
	within(t, "l", length.X, 50000838, 0.5)
	within(t, "u(l)", length.U(), 31.664, 0.02)
	within(t, "effective dof", length.DOF(), 16.752, 0.05)
	within(t, "t99", CoverageFactor(0.99, length.DOF()), 2.92, 0.005) // dof truncated to 16
	within(t, "U99", length.Value().Expanded(0.99), 92.48, 0.1)       // the standard prints 93 from rounded figures
}

// JCGM 100:2008 H.2: resistance, reactance and impedance from V, I and phase read
// together. Raw rows of table H.2; u(R) = 0.071, not the 0.195 of independent inputs.
func TestImpedanceH2(t *testing.T) {
	in, err := Simultaneous(
		[]float64{5.007, 4.994, 5.005, 4.990, 4.999},
		[]float64{19.663e-3, 19.639e-3, 19.640e-3, 19.685e-3, 19.678e-3},
		[]float64{1.0456, 1.0438, 1.0468, 1.0428, 1.0433})
	if err != nil {
		t.Fatal(err)
	}
	within(t, "u(V)", in.U(0), 0.0032094, 1e-7)
	within(t, "u(I)", in.U(1), 9.4710e-6, 1e-10)
	within(t, "u(phase)", in.U(2), 0.00075206, 1e-8)
	within(t, "r(V,I)", in.R(0, 1), -0.36, 0.005)
	within(t, "r(V,phase)", in.R(0, 2), 0.86, 0.005)
	within(t, "r(I,phase)", in.R(1, 2), -0.65, 0.005)

	resistance := func(x []float64) float64 { return x[0] / x[1] * math.Cos(x[2]) }
	reactance := func(x []float64) float64 { return x[0] / x[1] * math.Sin(x[2]) }
	impedance := func(x []float64) float64 { return x[0] / x[1] }
	out := in.Through(resistance, reactance, impedance)
	for i, want := range []struct{ x, u float64 }{{127.732, 0.071}, {219.847, 0.295}, {254.260, 0.236}} {
		within(t, "estimate", out.X[i], want.x, 0.0006)
		within(t, "uncertainty", out.U(i), want.u, 0.001)
	}
	within(t, "r(R,X)", out.R(0, 1), -0.588, 0.001)
	within(t, "r(R,Z)", out.R(0, 2), -0.485, 0.001)
	within(t, "r(X,Z)", out.R(1, 2), 0.993, 0.001)

	// The wrong figure, for which the standard warns: covariances left out.
	alone := Joint{X: in.X, Cov: mat.NewSymDense(3, []float64{in.Cov.At(0, 0), 0, 0, 0, in.Cov.At(1, 1), 0, 0, 0, in.Cov.At(2, 2)})}
	within(t, "u(R) without correlation", alone.Through(resistance).U(0), 0.195, 0.001)
}

// JCGM 100:2008 H.3: the correction of a thermometer as a straight line; the
// parameters of the fit are correlated (r = −0.930), which the value at 30 °C needs.
func TestThermometerH3(t *testing.T) {
	line := Joint{X: []float64{-0.17120379, 0.0021826977}, Cov: mat.NewSymDense(2, []float64{
		0.00287760 * 0.00287760, -0.930430 * 0.00287760 * 0.0006679388,
		-0.930430 * 0.00287760 * 0.0006679388, 0.0006679388 * 0.0006679388})}
	at30 := line.Through(func(y []float64) float64 { return y[0] + y[1]*(30-20) })
	within(t, "b(30)", at30.X[0], -0.1494, 0.00005)
	within(t, "u(b(30))", at30.U(0), 0.0041, 0.00005)
}

// JCGM 100:2008 table G.2, two-sided 95 %; and the standard's 1.96 for a normal.
func TestCoverageFactorTableG2(t *testing.T) {
	for dof, want := range map[float64]float64{1: 12.71, 2: 4.30, 3: 3.18, 4: 2.78, 5: 2.57, 9: 2.26, 10: 2.23, 16: 2.12, 20: 2.09, 50: 2.01} {
		within(t, "t95", CoverageFactor(0.95, dof), want, 0.005)
	}
	within(t, "k of a normal", CoverageFactor(0.95, math.Inf(1)), 1.96, 0.0001)
	within(t, "dof truncated", CoverageFactor(0.95, 5.9), CoverageFactor(0.95, 5), 0)
	within(t, "dof below one", CoverageFactor(0.95, 0.4), CoverageFactor(0.95, 1), 0)
}

// Two small worked cases of Welch–Satterthwaite in public use (GUM G.4.1 with
// known answers): 0.57 (9) with 0.25 (inf) gives 12.8, and y = X1/X2·Y.
func TestWelchSatterthwaiteG4(t *testing.T) {
	b := New(0, Scatter("a", Value{U: 0.57, DOF: 9}), Known("b", 0.25))
	within(t, "dof", b.DOF(), 12.8, 0.05)

	read := func(x, u, dof float64) Budget { return New(x, Scatter("reading", Value{U: u, DOF: dof})) }
	y := Propagate(func(x []float64) float64 { return x[0] / x[1] * x[2] },
		read(0.1820, 0.00093, 9), read(0.1823, 0.00058, 19), read(0.6978, 0.0026, 19)).Value()
	within(t, "y", y.X, 0.6967, 0.00005)
	within(t, "u(y)", y.U, 0.00494, 0.00001) // published from rounded intermediates; 0.004932 unrounded
	within(t, "dof of y", y.DOF, 27.7, 0.25)
	within(t, "U95", y.Expanded(0.95), 0.0101, 0.00005)
}

// JCGM 100:2008 4.4.5, 4.4.6 and F.2.2.1: u of a rectangular ±4 and a triangular
// ±4 (2.3 and 1.6), and 0.29 of a step.
func TestTypeB(t *testing.T) {
	within(t, "rectangular", Rectangular("", 4).U, 2.3, 0.05)
	within(t, "triangular", Triangular("", 4).U, 1.6, 0.05)
	within(t, "resolution", Resolution("", 1).U, 0.29, 0.005)
	within(t, "normal", Normal("", 0.00024, 3).U, 80e-6, 1e-9) // GUM 4.3.3: 240 µg at 3σ is 80 µg
	within(t, "judged 25 %", JudgedDOF(0.25), 8, 1e-12)        // GUM G.4.2 example
}
