package practice

import (
	"context"
	"math"

	"nightbench/instruments/practice/circuit"
)

// acquisition is one record being taken, or taken. Its settings are those at its
// start; y, origin and codes are written before done is closed and read after.
type acquisition struct {
	cancel context.CancelFunc
	done   chan struct{}

	inputs   [scopeInputs]input
	points   int
	interval float64 // s
	source   int     // channel that triggers; 0: immediate
	level    float64
	falling  bool
	auto     bool // an automatic trigger where none comes
	see      func(n int, in *input, y []float64, interval float64)

	triggered bool
	origin    float64                // s, of the first sample from the trigger
	y         [scopeInputs][]float64 // volts by channel
	have      bool
	codes     [scopeInputs][]int16
}

func (a *acquisition) over() bool {
	select {
	case <-a.done:
		return true
	default:
		return false
	}
}

// take records blocks of twice a record's length until one holds a trigger with a
// tenth of a record before it and the rest behind it.
func (a *acquisition) take(ctx context.Context, w *world) {
	var probes []circuit.Probe
	for _, in := range a.inputs {
		if in.wired {
			probes = append(probes, in.probe)
		}
	}
	length := a.points
	if a.source > 0 {
		length *= 2
	}
	for began := w.now(); ; {
		block := a.watch(w, probes, length)
		if !a.await(ctx, w, block, length) {
			return
		}
		a.feel(block.Y)
		late := a.auto && w.now()-began >= autoWait
		if a.cut(block.Y) || late && a.cutAt(block.Y, 0, 0) {
			return
		}
	}
}

// watch lets a block of samples be taken from the board's present on.
func (a *acquisition) watch(w *world, probes []circuit.Probe, length int) (r *circuit.Record) {
	w.do(func(s *circuit.Sim) {
		r = circuit.NewRecord(s.Now(), a.interval, length, probes...)
		if err := s.Watch(r); err != nil {
			panic(err) // the window begins at the board's own present
		}
	})
	return r
}

// await waits until a block is complete; false when it was aborted.
func (a *acquisition) await(ctx context.Context, w *world, r *circuit.Record, length int) bool {
	end := r.T0 + float64(length)*a.interval
	if err := w.clock.Sleep(ctx, seconds(end-w.now())); err != nil {
		return false
	}
	w.mu.Lock()
	defer w.mu.Unlock()
	w.advance(math.Max(w.now(), end))
	return true
}

// feel takes the block through the front end, so that the trigger sees what the converter sees.
func (a *acquisition) feel(rows [][]float64) {
	row := 0
	for i := range a.inputs {
		if a.inputs[i].wired {
			a.see(i, &a.inputs[i], rows[row], a.interval)
			row++
		}
	}
}

// cut looks for the trigger in a block and takes the record round it.
func (a *acquisition) cut(rows [][]float64) bool {
	first, origin := 0, 0.0
	if a.source > 0 {
		before := int(beforeTrigger * float64(a.points))
		at, fraction, ok := a.trigger(rows, before)
		if !ok || at-before+a.points > len(rows[0]) {
			return false
		}
		a.triggered = true
		first, origin = at-before, -(float64(before)+fraction)*a.interval
	}
	return a.cutAt(rows, first, origin)
}

// cutAt takes the record from a sample on. It is always true.
func (a *acquisition) cutAt(rows [][]float64, first int, origin float64) bool {
	row := 0
	for i, in := range a.inputs {
		if in.wired {
			a.y[i] = rows[row][first : first+a.points]
			row++
		} else {
			a.y[i] = make([]float64, a.points)
		}
	}
	a.origin, a.have = origin, true
	return true
}

// trigger finds the first crossing at or after sample before: the sample just
// before it, and the fraction of an interval to it.
func (a *acquisition) trigger(rows [][]float64, before int) (at int, fraction float64, ok bool) {
	row := 0
	for i, in := range a.inputs {
		if i+1 == a.source {
			if !in.wired {
				return 0, 0, false
			}
			break
		}
		if in.wired {
			row++
		}
	}
	y, sign := rows[row], 1.0
	if a.falling {
		sign = -1
	}
	for k := max(before, 0); k+1 < len(y); k++ {
		if p, q := sign*(y[k]-a.level), sign*(y[k+1]-a.level); p < 0 && q >= 0 {
			return k, p / (p - q), true
		}
	}
	return 0, 0, false
}
