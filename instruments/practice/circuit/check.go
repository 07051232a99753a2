package circuit

import "fmt"

func above(what string, v, limit float64) error {
	if v > limit {
		return nil
	}
	return fmt.Errorf("circuit: %s is %g; it must be above %g", what, v, limit)
}

func notBelow(what string, v, limit float64) error {
	if v >= limit {
		return nil
	}
	return fmt.Errorf("circuit: %s is %g; it must not be below %g", what, v, limit)
}

func within(what string, v, lo, hi float64) error {
	if v >= lo && v <= hi {
		return nil
	}
	return fmt.Errorf("circuit: %s is %g; it must be from %g to %g", what, v, lo, hi)
}

func levels(what string, l Levels) error {
	for k, c := range l {
		if len(c.Points) == 0 {
			return fmt.Errorf("circuit: %s: the curve at %g V has no points", what, c.Supply)
		}
		if k > 0 && c.Supply <= l[k-1].Supply {
			return fmt.Errorf("circuit: %s: curves must be by ascending supply, %g V follows %g V", what, c.Supply, l[k-1].Supply)
		}
		for j := 1; j < len(c.Points); j++ {
			if c.Points[j].Amps <= c.Points[j-1].Amps || c.Points[j].Volts < c.Points[j-1].Volts {
				return fmt.Errorf("circuit: %s: the curve at %g V must rise with current at %g A", what, c.Supply, c.Points[j].Amps)
			}
		}
	}
	return nil
}

func diodes(timing1, timing2, flyback, body *Diode) error {
	for _, d := range []*Diode{timing1, timing2} {
		if d != nil && (d.Is <= 0 || d.N <= 0 || d.Knee != 0) {
			return fmt.Errorf("circuit: a timing diode needs Is and N above 0 and no knee, found Is = %g, N = %g, knee = %g", d.Is, d.N, d.Knee)
		}
	}
	for _, d := range []*Diode{timing1, timing2, flyback, body} {
		if d != nil && (d.Is < 0 || d.Is > 0 && d.N <= 0 || d.Rs < 0) {
			return fmt.Errorf("circuit: a diode needs Is, Rs not below 0 and N above 0, found Is = %g, N = %g, Rs = %g", d.Is, d.N, d.Rs)
		}
	}
	return nil
}
