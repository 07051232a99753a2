package pulse

import "sort"

// Len is the number of samples.
func (r Record) Len() int { return max(len(r.Codes), len(r.Volts)) }

// Volt is the voltage of sample i.
func (r Record) Volt(i int) float64 {
	if r.Codes == nil {
		return r.Volts[i]
	}
	return r.Zero + r.PerCode*float64(r.Codes[i])
}

// At is the time of sample i, s.
func (r Record) At(i int) float64 {
	if r.Times != nil {
		return r.Times[i]
	}
	return r.Start + float64(i)*r.Interval
}

// Index is the last sample at or before time t (s); the first sample when there is none.
func (r Record) Index(t float64) int {
	return max(0, sort.Search(r.Len(), func(i int) bool { return r.At(i) > t })-1)
}
