package numeric

import "math"

// Omega is the real Wright omega function: the w that solves w + ln w = x, that
// is W(exp x) with Lambert's W, without the overflow of exp. A resistor in
// series with a diode is solved by it in closed form.
//
// Method: a guess by region, then three steps of the fourth-order iteration of
// Fritsch, Shafer and Crowley (CACM 16, 1973), as in Lawrence, Corless and
// Jeffrey, ACM TOMS Algorithm 917, 2012. Relative error a few units in the last place.
func Omega(x float64) float64 {
	switch {
	case math.IsNaN(x) || math.IsInf(x, 1):
		return x
	case x < -40:
		return math.Exp(x) // w = e^(x-w), and w < 5e-18 no longer shows
	case x > 1e17:
		return x - math.Log(x)
	}
	w := omegaGuess(x)
	for range 3 {
		r := x - w - math.Log(w)
		t := (1 + w) * (1 + w + 2*r/3)
		w *= 1 + r/(1+w)*(t-r/2)/(t-r)
	}
	return w
}

func omegaGuess(x float64) float64 {
	switch {
	case x < -2:
		e := math.Exp(x)
		return e * (1 - e*(1-1.5*e)) // series of W about 0
	case x < math.Pi+1:
		h := x - 1 // Taylor about omega(1) = 1
		return 1 + h/2 + h*h/16 - h*h*h/192
	}
	l := math.Log(x)
	return x - l + l/x
}
