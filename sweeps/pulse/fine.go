package pulse

import "math"

// A level among few codes. Noise of less than about half a converter step does not
// smooth the steps away: the mean of the codes is drawn towards their centres, by up to
// half a step. What the samples of a state say is then best read from how they
// spread over the codes: each code's share is the noise's probability between its two
// thresholds. Level and noise are found together, the noise the same in all states,
// by the posterior mean over a grid, flat in the level and in the logarithm of the
// noise (Bayes; the model of rounded Gaussian readings is Sheppard's).

// shares counts the samples of a state on the codes about its own.
type shares struct {
	centre float64 // code of the middle count
	n      [2*codesAbout + 1]float64
	fits   [sigmas][]float64 // likelihood by noise and level

	off, where float64 // samples on other codes, and the sum of their places in the state, from 0 to 1
}

const (
	codesAbout = 3
	sigmas     = 16
	places     = 61
	mostNoise  = 0.75 // steps of noise above which the mean of the codes is as good as exact
	leastNoise = 0.02 // steps of noise below which it makes no difference
)

// sigmaAt is the noise at a place of the grid, steps; none at the first.
func sigmaAt(k int) float64 {
	if k == 0 {
		return 1e-9
	}
	return leastNoise * math.Pow(1.2/leastNoise, float64(k-1)/(sigmas-2))
}

// placeAt is the level at a place of the grid, steps from the centre.
func placeAt(i int) float64 { return (float64(i)/(places-1) - 0.5) * 1.6 }

// resolve finds the levels of states whose noise, pooled, is too small to smooth the converter's steps.
func (a *analysis) resolve(states ...*state) {
	a.resolved = false
	if math.Sqrt(max(0, a.noise/a.q/a.q-1.0/12)) > mostNoise {
		return
	}
	all := make([]shares, len(states))
	for i, s := range states {
		if s.n == 0 || s.spread > sq(1.6*a.q) {
			return
		}
		all[i] = a.shares(s)
		if !all[i].white() || s.own < 0.5*s.spread {
			return // the codes change with the waveform, not from sample to sample
		}
		all[i].fit()
	}
	var post [sigmas]float64
	for k := range post {
		post[k] = 1
		if k == 0 {
			post[k] = sigmas // as likely none at all as some
		}
		for i := range all {
			post[k] *= sumOf(all[i].fits[k])
		}
	}
	a.resolved = true
	for i, s := range states {
		s.place(all[i], post, a.q)
	}
}

// shares counts the settled samples of a state, those farther off left out.
func (a *analysis) shares(s *state) shares {
	h := shares{centre: math.Round(s.level/a.q) * a.q}
	if n, _ := a.h.within(h.centre-0.01, h.centre+0.01); n == 0 && a.q > 1 {
		h.centre = math.Round((s.level+1)/a.q)*a.q - 1 // inverted codes are one less than a multiple
	}
	s.each(a.codes, func(c int16, place float64) {
		k := math.Round((float64(c) - h.centre) / a.q)
		if math.Abs(k) > codesAbout {
			return
		}
		h.n[int(k)+codesAbout]++
		if k != 0 {
			h.off++
			h.where += place
		}
	})
	return h
}

// white tells whether the samples on other codes come anywhere in the state, as those of
// noise do, and not early in it, as those of a tail or of ringing do. A uniform place has
// mean 1/2 and standard deviation 1/√12.
func (h *shares) white() bool {
	return h.off == 0 || h.where/h.off > 0.5-0.29/math.Sqrt(h.off)
}

// fit fills in the likelihood over the grid, its largest value over all of it being 1.
func (h *shares) fit() {
	top := math.Inf(-1)
	for k := range h.fits {
		h.fits[k] = make([]float64, places)
		sigma := sigmaAt(k) * math.Sqrt2
		for i := range h.fits[k] {
			var l float64
			for j, n := range h.n {
				if n == 0 {
					continue
				}
				d := float64(j-codesAbout) - placeAt(i)
				p := 0.5 * (math.Erf((d+0.5)/sigma) - math.Erf((d-0.5)/sigma))
				l += n * math.Log(max(p, 1e-5)) // a stray sample must not decide
			}
			h.fits[k][i] = l
			top = max(top, l)
		}
	}
	for k := range h.fits {
		for i, l := range h.fits[k] {
			h.fits[k][i] = math.Exp(l - top)
		}
	}
}

func sumOf(values []float64) (s float64) {
	for _, v := range values {
		s += v
	}
	return s
}

// place sets level and uncertainty to mean and standard deviation of the posterior. What the
// occurrences scatter beyond white noise stays in the random part.
func (st *state) place(h shares, post [sigmas]float64, q float64) {
	var w, m, v float64
	for k, p := range post {
		total := sumOf(h.fits[k])
		if !(total > 0) {
			continue
		}
		for i, f := range h.fits[k] {
			x := placeAt(i)
			w += p * f / total
			m += p * f / total * x
			v += p * f / total * x * x
		}
	}
	if !(w > 0) {
		return
	}
	m /= w
	v = max(sq(1.6/(places-1))/12, v/w-m*m)
	level := h.centre + m*q
	white := math.Sqrt(st.noise / float64(st.n))
	st.shift = level - st.level
	st.level = level
	st.uRound = q * math.Sqrt(v)
	if st.uRandom <= 1.2*white {
		st.uRandom = 0 // it is in the posterior
	}
}
