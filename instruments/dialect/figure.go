package dialect

import "nightbench/instruments"

// Figure is a maker's limit of error for one quantity and range, in the unit
// of the quantity. A file states it in any of the forms in use:
//
//	reading and of_range          shares, in % or ppm: bench meters
//	reading, counts, resolution   counts of the last digit: panel meters
//	reading and offset            supplies
//	reading, offset, divisions    scopes: divisions of the screen, and gain_from = "offset" where the gain's share
//	                              is of the distance from the offset
//	time_base in [waveform]       ppm, and ppm a year
//
// Range is 0 where the instrument has a single one; Highest is the reading
// above which it says overload, 0 where that is not known.
type Figure struct {
	Of         string
	Channel    int // 0: all
	Range      float64
	Highest    float64
	Accuracy   instruments.Accuracy
	FromOffset bool // the reading's share is of its distance from the middle of the screen
	Source     string
	Note       string
}

// Figure finds the figure of a quantity for a range on a channel: the one whose
// range is nearest at or above full, or the only one. A figure of the channel's
// own wins.
func (d *Dialect) Figure(of string, full float64, channel int) (Figure, bool) {
	var best Figure
	found := false
	for _, f := range d.Figures {
		if f.Of != of || f.Channel != 0 && f.Channel != channel || f.Range > 0 && f.Range < full*(1-1e-6) {
			continue
		}
		if !found || f.Range < best.Range || f.Range == best.Range && f.Channel > best.Channel {
			best, found = f, true
		}
	}
	return best, found
}

// At is the limit of error at a given middle of the screen: the share of the
// distance from there is at most that of the reading and of the middle together.
func (f Figure) At(middle float64) instruments.Accuracy {
	a := f.Accuracy
	if f.FromOffset {
		a.Offset += a.Reading * max(middle, -middle)
	}
	return a
}
