package predict

import (
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"sync"

	"nightbench/sweeps"
)

// Ensemble is a number of boards drawn within tolerance. Each keeps its parts at
// every setting, so that a curve's points move together (JCGM 101:2008). It is
// immutable, and safe for use by several goroutines.
type Ensemble struct {
	m     *Model
	draws []parts
}

// Draw draws n boards. The same seed gives the same boards, and the first of
// many are the same as the first of few.
func (m *Model) Draw(n int, seed uint64) *Ensemble {
	r := rand.New(rand.NewPCG(seed, 0x6e69676874)) // the second word only sets the stream apart
	e := &Ensemble{m: m, draws: make([]parts, max(n, 0))}
	for k := range e.draws {
		p := &e.draws[k]
		*p = m.nominal
		for i := range m.variables {
			v := &m.variables[i]
			*v.at(p) = v.draw(r)
		}
	}
	return e
}

// Size is the number of boards drawn.
func (e *Ensemble) Size() int { return len(e.draws) }

// At gives the nominal value of each quantity and the interval that holds the
// middle 95 % of the drawn boards that oscillate. Flags are the nominal board's,
// and the share of draws that do not oscillate. A setting that cannot be gives no
// predictions and a flag that says why.
func (e *Ensemble) At(s Setting) (map[sweeps.Quantity]sweeps.Prediction, []sweeps.Flag) {
	if err := e.m.checkSetting(s); err != nil {
		return map[sweeps.Quantity]sweeps.Prediction{}, []sweeps.Flag{{Name: "bad_setting", Words: err.Error()}}
	}
	nominal := e.m.solve(&e.m.nominal, s.conditions())
	b := e.bands(s, &nominal, make([]row, len(e.draws)))
	out := make(map[sweeps.Quantity]sweeps.Prediction, len(predicted))
	for i, q := range predicted {
		if !math.IsNaN(b.value[i]) {
			out[q] = sweeps.Prediction{Value: b.value[i], Low: b.low[i], High: b.high[i], Unit: q.Unit()}
		}
	}
	return out, e.flags(&nominal, s, &b)
}

// flags adds, to those of a nominal board that works, how many of the drawn ones do not.
func (e *Ensemble) flags(nominal *outcome, s Setting, b *band) []sweeps.Flag {
	fs := e.m.flags(nominal, s)
	add := func(name, format string, n int) {
		fs = append(fs, sweeps.Flag{Name: name, Words: fmt.Sprintf(format+": %d of %d boards drawn within tolerance do not", n, len(e.draws))})
	}
	if nominal.stop == oscillates && b.stopped > 0 {
		add(NoOscillation, "may not oscillate", b.stopped)
	}
	if !nominal.stalled && nominal.stop == oscillates && b.standing > 0 {
		add(Stalled, "the motor may not turn", b.standing)
	}
	return fs
}

// band is one setpoint of the ensemble.
type band struct {
	value, low, high row
	stopped          int // draws that do not oscillate
	standing         int // draws whose motor stands still
}

// bands computes all draws at a setting, on all processors, into rows.
func (e *Ensemble) bands(s Setting, nominal *outcome, rows []row) band {
	c := s.conditions()
	counts := make([]struct{ stopped, standing int }, workers)
	each(len(e.draws), func(w, from, to int) {
		for k := from; k < to; k++ {
			o := e.m.solve(&e.draws[k], c)
			rows[k] = o.row()
			switch {
			case o.stop != oscillates:
				counts[w].stopped++
			case o.stalled:
				counts[w].standing++
			}
		}
	})
	b := band{value: nominal.row()}
	b.low, b.high = b.value, b.value
	for _, n := range counts {
		b.stopped += n.stopped
		b.standing += n.standing
	}
	each(len(predicted), func(_, from, to int) {
		column := make([]float64, 0, len(rows))
		for i := from; i < to; i++ {
			if math.IsNaN(b.value[i]) {
				continue
			}
			if column = columnOf(column[:0], rows, i); len(column) > 0 {
				b.low[i], b.high[i] = interval95(column)
			}
		}
	})
	b.widen(e.m, nominal)
	return b
}

// columnOf collects quantity i of the rows that have it.
func columnOf(into []float64, rows []row, i int) []float64 {
	for k := range rows {
		if v := rows[k][i]; !math.IsNaN(v) {
			into = append(into, v)
		}
	}
	return into
}

// widen makes room for what the laws leave out. A speed that is not constant: half
// the peak-to-peak change in a period, T/τm·D(1−D)/2 of the value, on all that the
// motor decides. A winding that shares the output with the timing network: on everything but what is set.
func (b *band) widen(m *Model, o *outcome) {
	if o.stop != oscillates {
		return
	}
	if share := m.shared(); share > 0 && o.held == Oscillating {
		for i := range b.value {
			if i != qSupplyVoltage && i != qPotResistance && i != qControlVoltage && i != qAmbient {
				b.grow(i, share)
			}
		}
	}
	if ratio := o.ripple(); ratio >= rippleLimit && o.k > 0 {
		d := o.high / (o.high + o.low)
		for _, i := range []int{qAverageVoltage, qMotorCurrent, qSupplyCurrent, qSupplyPower, qBackEMF, qConduction, qSpeed, qOutputDrop} {
			b.grow(i, math.Min(0.5, ratio*d*(1-d)/2))
		}
	}
	b.high[qDuty] = math.Min(1, b.high[qDuty])
	b.high[qConduction] = math.Min(1, b.high[qConduction])
}

// grow moves both limits of a quantity out by a share of its value.
func (b *band) grow(i int, share float64) {
	extra := share * math.Abs(b.value[i])
	b.low[i] -= extra
	b.high[i] += extra
}

// workers is how many goroutines compute at once.
var workers = runtime.GOMAXPROCS(0)

// each runs work over 0…n−1 in one contiguous share a worker, and waits for all.
func each(n int, work func(worker, from, to int)) {
	if n < 2*workers {
		work(0, 0, n)
		return
	}
	var wg sync.WaitGroup
	for w := range workers {
		wg.Go(func() { work(w, w*n/workers, (w+1)*n/workers) })
	}
	wg.Wait()
}
