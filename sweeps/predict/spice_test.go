package predict

import (
	"bufio"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"nightbench/sweeps"
)

// Networks and stages absent from the reference tables are simulated here, with a
// general circuit simulator (ngspice) that knows nothing of the closed forms. The
// netlists describe the board by its schematic; measured are level crossings and means.

// deck is a netlist being written, and what to measure of it.
type deck struct {
	lines       []string
	stop        float64 // s
	step        float64
	temperature float64 // degC
}

func (d *deck) add(format string, a ...any) { d.lines = append(d.lines, fmt.Sprintf(format, a...)) }

// trace is a simulated record: time and named vectors, one value a step.
type trace struct {
	t []float64
	v map[string][]float64
}

// manners are the ways to run a deck, tried in turn: an edge now and then stops the
// simulator's step control, and another tolerance or step takes it past.
var manners = []struct {
	options string
	step    float64
}{
	{"reltol=1e-5 abstol=1e-11 vntol=1e-7 chgtol=1e-15 method=gear", 1},
	{"reltol=1e-4 abstol=1e-10 vntol=1e-6 method=gear", 0.7},
	{"reltol=1e-4 abstol=1e-9 vntol=1e-6 method=trap", 0.5},
	{"reltol=3e-4 abstol=1e-9 vntol=1e-5 method=gear itl4=200", 0.4},
}

// simulate runs the deck and reads the vectors back.
func (d *deck) simulate(t testing.TB, vectors ...string) trace {
	t.Helper()
	for _, way := range manners {
		tr := d.run(t, way.options, d.step*way.step, vectors)
		if n := len(tr.t); n > 0 && tr.t[n-1] > 0.999*d.stop {
			return tr
		}
	}
	t.Fatalf("the simulator gave up on\n%s", strings.Join(d.lines, "\n"))
	return trace{}
}

func (d *deck) run(t testing.TB, options string, step float64, vectors []string) trace {
	t.Helper()
	dir := t.TempDir()
	out := filepath.Join(dir, "out.txt")
	text := "* board\n" + strings.Join(d.lines, "\n") + fmt.Sprintf(`
.options %s temp=%g tnom=27
.control
set wr_singlescale
set numdgt=12
tran %g %g 0 %g uic
wrdata %s %s
quit
.endc
.end
`, options, d.temperature, step, d.stop, step, out, strings.Join(vectors, " "))
	file := filepath.Join(dir, "deck.cir")
	if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	if msg, err := exec.Command("ngspice", "-b", file).CombinedOutput(); err != nil {
		t.Fatalf("ngspice: %v\n%s\n%s", err, msg, text)
	}
	return readTrace(t, out, vectors)
}

func readTrace(t testing.TB, path string, vectors []string) trace {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	tr := trace{v: map[string][]float64{}}
	for s := bufio.NewScanner(f); s.Scan(); {
		cols := strings.Fields(s.Text())
		if len(cols) != len(vectors)+1 {
			continue
		}
		for i, c := range cols {
			x, err := strconv.ParseFloat(c, 64)
			if err != nil {
				t.Fatal(err)
			}
			if i == 0 {
				tr.t = append(tr.t, x)
				continue
			}
			tr.v[vectors[i-1]] = append(tr.v[vectors[i-1]], x)
		}
	}
	return tr
}

// crossings are the instants at which a vector passes a level, rising or falling.
func (tr *trace) crossings(name string, level float64, rising bool) []float64 {
	v := tr.v[name]
	var out []float64
	for i := 1; i < len(v); i++ {
		if (v[i-1] < level) == rising && (v[i] >= level) == rising && v[i] != v[i-1] {
			out = append(out, tr.t[i-1]+(tr.t[i]-tr.t[i-1])*(level-v[i-1])/(v[i]-v[i-1]))
		}
	}
	return out
}

// mean of a vector between two instants, by trapezoids.
func (tr *trace) mean(name string, from, to float64) float64 {
	v := tr.v[name]
	var sum float64
	at := func(i int, x float64) float64 {
		return v[i-1] + (v[i]-v[i-1])*(x-tr.t[i-1])/(tr.t[i]-tr.t[i-1])
	}
	for i := 1; i < len(v); i++ {
		a, b := math.Max(from, tr.t[i-1]), math.Min(to, tr.t[i])
		if b > a {
			sum += (b - a) * (at(i, a) + at(i, b)) / 2
		}
	}
	return sum / (to - from)
}

// rhythm measures the last whole high and low phase of the latch "h" (0 or 1 V).
func (tr *trace) rhythm(t *testing.T) (high, low float64) {
	t.Helper()
	up, down := tr.crossings("v(h)", 0.5, true), tr.crossings("v(h)", 0.5, false)
	if len(up) < 3 || len(down) < 3 {
		t.Fatalf("too few periods: %d rising, %d falling edges", len(up), len(down))
	}
	last := up[len(up)-1]
	for i := len(down) - 1; i >= 0; i-- {
		if down[i] < last {
			return down[i] - up[len(up)-2], last - down[i]
		}
	}
	t.Fatal("no whole period")
	return 0, 0
}

func needSpice(t *testing.T) {
	t.Helper()
	if _, err := exec.LookPath("ngspice"); err != nil {
		if os.Getenv("CI") != "" {
			t.Fatal("ngspice is not installed; .ci/run installs it")
		}
		t.Skip("ngspice is not installed: apt-get install ngspice")
	}
}

// spiceTiming writes the timing network of a board: x the capacitor, q the discharge
// pin, o the output, h the latch. Comparators are hysteresis on one node.
func spiceTiming(d *deck, m *Model, s Setting) {
	p := &m.nominal
	tm := &m.board.Timing
	d.add("vs s 0 %g", s.Supply)
	diode := func(name string, part *diode) {
		d.add(".model %s d(is=%g n=%g rs=%g eg=%g xti=%g)", name, part.is, part.n, part.rs, part.eg, part.xti)
	}
	diode("dc", &p.chargeDiode)
	diode("dd", &p.dischargeDiode)
	c := s.conditions()
	rs := m.resistances(p, &c)
	switch tm.Network {
	case sweeps.Plain:
		d.add("ra s q %g\nrb q x %g", rs.charge, rs.discharge)
	case sweeps.Bypassed:
		d.add("ra s q %g\nrb q x %g\nd1 q x dc", rs.charge, rs.discharge)
	case sweeps.Steered:
		d.add("ra s q %g\nrb y q %g\nd1 q x dc\nd2 x y dd", rs.charge, rs.discharge)
	case sweeps.Wiper:
		d.add("ra s q %g\nrw q w %g\nru w a %g\nd1 a x dc\nd2 x b dd\nrd b w %g", rs.charge, math.Max(p.wiper, 1e-3), rs.up, rs.down)
	case sweeps.OutputFed:
		d.add("rc o w %g", math.Max(rs.common, 1e-3))
		switch {
		case p.chargeDiode.is == 0:
			d.add("ru w x 1e-3")
		default:
			d.add("ru w a %g\nd1 a x dc\nd2 x b dd\nrd b w %g", math.Max(rs.charge, 1e-3), math.Max(rs.discharge, 1e-3))
		}
	}
	th, tr := m.thresholds(p, &c)
	d.add("cx x 0 %g ic=%g", p.capacitor, tr)
	if bias := p.timer.triggerCurrent - p.timer.thresholdCurrent; bias != 0 {
		d.add("ib 0 x %g", bias)
	}
	// the latch: a switch with hysteresis about the middle of the two levels, on while low
	d.add(".model latch sw(vt=%g vh=%g ron=1m roff=1e9)", (th+tr)/2, (th-tr)/2)
	d.add("vone one 0 1\nrl one h 1k\nsl h 0 x 0 latch off")
	if tm.Network != sweeps.OutputFed {
		d.add(".model pin sw(vt=0.5 vh=0 ron=%g roff=1e12)", math.Max(p.timer.resistance, 1e-3))
		d.add("bnot l 0 v=1-v(h)\nvo7 q7 0 %g\ns7 q q7 l 0 pin", p.timer.offset)
	}
}
