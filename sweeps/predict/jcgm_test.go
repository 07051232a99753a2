package predict

import (
	"math"
	"math/rand/v2"
	"testing"
)

// The examples of JCGM 101:2008, clause 9, through the same draws and the same
// interval as a board's bands: a million draws, within four standard errors.

const million = 1_000_000

// propagate draws the inputs and gives mean, standard deviation and 95 % interval of the model's output.
func propagate(seed uint64, model func(x []float64) float64, inputs ...spread) (mean, u, low, high float64) {
	r := rand.New(rand.NewPCG(seed, 101))
	y := make([]float64, million)
	x := make([]float64, len(inputs))
	var sum, sq float64
	for k := range y {
		for i := range inputs {
			x[i] = inputs[i].draw(r)
		}
		y[k] = model(x)
		sum += y[k]
		sq += y[k] * y[k]
	}
	low, high = interval95(y)
	mean = sum / million
	return mean, math.Sqrt(sq/million - mean*mean), low, high
}

func add(x []float64) (s float64) {
	for _, v := range x {
		s += v
	}
	return s
}

// gaussian is normal with a standard deviation; uniform rectangular with one.
func gaussian(mean, sd float64) spread { return spread{mean, mean - 2*sd, mean + 2*sd, normal} }
func uniform(low, high float64) spread { return spread{(low + high) / 2, low, high, rectangular} }
func uniformSD(sd float64) spread      { return uniform(-sd*math.Sqrt(3), sd*math.Sqrt(3)) }

// quantileError is the standard error of a 2.5 % point at a million draws, from the density there.
func quantileError(density float64) float64 { return math.Sqrt(0.025*0.975/million) / density }

func within4(t *testing.T, what string, got, want, se float64) {
	t.Helper()
	if !(math.Abs(got-want) <= 4*se) {
		t.Errorf("%s is %.6f, the standard has %.6f: more than four standard errors of %.2g", what, got, want, se)
	}
}

func TestAdditiveModels(t *testing.T) {
	se := 1 / math.Sqrt(million)
	for _, c := range []struct {
		name              string
		inputs            []spread
		u, limit, density float64
	}{
		// 9.2.2: four standard normal inputs: u = 2, 1.959964·2.
		{"normal", []spread{gaussian(0, 1), gaussian(0, 1), gaussian(0, 1), gaussian(0, 1)}, 2, 3.919928, 0.0292},
		// 9.2.3: four rectangular inputs of unit standard deviation: 2√3·(2 − (3/5)^¼) = 3.879407.
		{"rectangular", []spread{uniformSD(1), uniformSD(1), uniformSD(1), uniformSD(1)}, 2, 3.879407, 0.0328},
		// 9.2.4: the fourth ten times as wide: 17.015814 (the standard prints 17.0).
		{"one dominant", []spread{uniformSD(1), uniformSD(1), uniformSD(1), uniformSD(10)}, math.Sqrt(103), 17.015814, 0.0165},
	} {
		mean, u, low, high := propagate(1, add, c.inputs...)
		within4(t, c.name+" mean", mean, 0, c.u*se)
		within4(t, c.name+" u", u, c.u, c.u*se)
		within4(t, c.name+" low", low, -c.limit, quantileError(c.density))
		within4(t, c.name+" high", high, c.limit, quantileError(c.density))
	}
}

// 9.3, mass calibration: first-order propagation gives u = 0.0539 mg, the truth is
// 0.0754 mg (the standard's own draws). Its interval, 1.0834 to 1.3825 mg, is the
// shortest, whose ends scatter more than those of the symmetric one: 2 ug are allowed.
func TestMassCalibration(t *testing.T) {
	mass := func(x []float64) float64 {
		return (x[0]+x[1])*(1+(x[2]-1.2)*(1/x[3]-1/x[4])) - 100_000
	}
	mean, u, low, high := propagate(2, mass, gaussian(100_000, 0.05), gaussian(1.234, 0.02), uniform(1.1, 1.3), uniform(7000, 9000), uniform(7950, 8050))
	both := math.Sqrt2 // theirs was drawn too
	within4(t, "mean", mean, 1.2341, both*0.0754/1000)
	within4(t, "u", u, 0.0754, both*0.0754/1000)
	within4(t, "low", low, 1.0834, 0.0005)
	within4(t, "high", high, 1.3825, 0.0005)
}

// Triangular and logarithmic draws against their closed moments: the triangle of
// JCGM 101, 6.4.5 has mean (a+b+c)/3; a logarithmic rectangle has its median at the geometric mean.
func TestLeaningSpreads(t *testing.T) {
	s := spread{typical: 0.5, low: 0.1, high: 2, shape: triangular}
	mean, u, low, high := propagate(3, add, s)
	within4(t, "triangle mean", mean, (0.5+0.1+2)/3, u/1000)
	if low < 0.1 || high > 2 {
		t.Errorf("triangle: interval %g to %g leaves its limits", low, high)
	}
	r := rand.New(rand.NewPCG(4, 4))
	l := spread{typical: 2, low: 1, high: 4, shape: logarithmic}
	below := 0
	for range million {
		if l.draw(r) < 2 {
			below++
		}
	}
	within4(t, "share below the geometric mean", float64(below)/million, 0.5, 0.0005)
}
