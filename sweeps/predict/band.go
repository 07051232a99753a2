package predict

import "math"

// interval95 gives the 2.5 % and 97.5 % points of the values: the probabilistically
// symmetric coverage interval of JCGM 101:2008, 7.7. It reorders the values. There must be at least one.
func interval95(values []float64) (low, high float64) {
	return quantile(values, 0.025), quantile(values, 0.975)
}

// quantile interpolates linearly between order statistics at h = (n−1)·p.
func quantile(values []float64, p float64) float64 {
	h := float64(len(values)-1) * p
	k := int(math.Floor(h))
	a := nth(values, k)
	f := h - float64(k)
	if f == 0 || k+1 == len(values) {
		return a
	}
	b := math.Inf(1) // nth leaves everything above k to its right
	for _, v := range values[k+1:] {
		b = math.Min(b, v)
	}
	return a + f*(b-a)
}

// nth is the k-th smallest value, by Hoare's quickselect with the median of three as pivot.
func nth(v []float64, k int) float64 {
	lo, hi := 0, len(v)-1
	for lo < hi {
		mid := lo + (hi-lo)/2
		pivot := max(min(v[lo], v[mid]), min(max(v[lo], v[mid]), v[hi]))
		i, j := lo, hi
		for i <= j {
			for v[i] < pivot {
				i++
			}
			for v[j] > pivot {
				j--
			}
			if i <= j {
				v[i], v[j] = v[j], v[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return v[k]
		}
	}
	return v[k]
}
