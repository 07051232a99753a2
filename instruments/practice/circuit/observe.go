package circuit

import "math"

// An Observer looks at every step inside its window. Steps do not end at the
// window's edges: the observer clips them.
type Observer interface {
	Observe(*Segment)
	Window() (from, to float64) // s
}

type watcher struct {
	Observer
	from, to float64
}

// A Mean is the mean of a probe over an aperture, with the lowest and highest
// value in it. Min and Max look at the ends of every step, where between two
// switchings a voltage or current has its extremes.
type Mean struct {
	Probe    Probe
	T0, T1   float64 // aperture, s
	Min, Max float64

	sum, seen float64

	// What had been seen by the last rising turn of the output, and what the whole
	// period before it gave.
	turnSum, turnSeen   float64
	wholeSum, wholeSeen float64
}

// NewMean looks at a probe from t0 to t1.
func NewMean(p Probe, t0, t1 float64) *Mean {
	return &Mean{Probe: p, T0: t0, T1: t1, Min: math.Inf(1), Max: math.Inf(-1)}
}

// Window is the aperture.
func (m *Mean) Window() (from, to float64) { return m.T0, m.T1 }

// Observe adds a step.
func (m *Mean) Observe(g *Segment) {
	a, b := math.Max(m.T0, g.T0), math.Min(m.T1, g.T1)
	if b <= a {
		return
	}
	m.sum += g.Mean(m.Probe, a, b) * (b - a)
	m.seen += b - a
	for _, t := range [2]float64{a, b} {
		y := g.See(m.Probe, t)
		m.Min, m.Max = math.Min(m.Min, y), math.Max(m.Max, y)
	}
}

func (m *Mean) span() float64 { return m.T1 - m.T0 }

func (m *Mean) turn(float64) {
	m.wholeSum, m.wholeSeen = m.sum-m.turnSum, m.seen-m.turnSeen
	m.turnSum, m.turnSeen = m.sum, m.seen
}

func (m *Mean) ready(period float64) bool {
	return math.Abs(m.wholeSeen-period) < 1e-6*period
}

func (m *Mean) carry(n float64) {
	m.sum += n * m.wholeSum
	m.seen += n * m.wholeSeen
	m.turnSum, m.turnSeen = m.sum, m.seen
	m.wholeSum, m.wholeSeen = 0, 0
}

// Value is the mean over what has been seen of the aperture; NaN before that.
func (m *Mean) Value() float64 { return m.sum / m.seen }

// A Record samples probes at equidistant instants, as a scope does. Y holds
// one row a probe; samples not yet taken are NaN.
type Record struct {
	Probes []Probe
	T0, DT float64 // first instant and interval, s
	Y      [][]float64

	next int
}

// NewRecord samples probes n times from t0 on, every dt seconds.
func NewRecord(t0, dt float64, n int, probes ...Probe) *Record {
	r := &Record{Probes: probes, T0: t0, DT: dt}
	for range probes {
		row := make([]float64, n)
		for k := range row {
			row[k] = math.NaN()
		}
		r.Y = append(r.Y, row)
	}
	return r
}

func (r *Record) len() int {
	if len(r.Y) == 0 {
		return 0
	}
	return len(r.Y[0])
}

// Window is the time of the record.
func (r *Record) Window() (from, to float64) {
	return r.T0, r.T0 + float64(max(r.len()-1, 0))*r.DT
}

// Observe takes the samples that fall into a step.
func (r *Record) Observe(g *Segment) {
	for ; r.next < r.len(); r.next++ {
		t := r.T0 + float64(r.next)*r.DT
		if t > g.T1 {
			return
		}
		if t < g.T0 {
			continue
		}
		x := g.At(t)
		for k, p := range r.Probes {
			r.Y[k][r.next] = g.see(p, &x)
		}
	}
}

// Edges notes when the timer's output turns, as a counter does.
type Edges struct {
	T0, T1        float64   // window, s
	Rising, Falls []float64 // s

	seen, high bool
}

// NewEdges notes the output's turns from t0 to t1.
func NewEdges(t0, t1 float64) *Edges { return &Edges{T0: t0, T1: t1} }

// Window is the time looked at.
func (e *Edges) Window() (from, to float64) { return e.T0, e.T1 }

// Observe notes a turn at the start of a step.
func (e *Edges) Observe(g *Segment) {
	if g.T1 <= e.T0 || g.T0 > e.T1 {
		return
	}
	high := g.High()
	if e.seen && high != e.high && g.T0 >= e.T0 {
		if high {
			e.Rising = append(e.Rising, g.T0)
		} else {
			e.Falls = append(e.Falls, g.T0)
		}
	}
	e.seen, e.high = true, high
}
