package practice

import (
	"context"
	"fmt"
	"math/rand/v2"
	"strconv"
	"strings"
	"sync/atomic"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
)

// Figures of the practice scope, those of the standard-scope dialect.
const (
	scopeInputs   = 4
	mostSamples   = 1_000_000
	fewestSamples = 10
	mostRate      = 1e9 // samples a second
	scopeAnswer   = 3e-3
	beforeTrigger = 0.1 // share of the record before the trigger
	autoWait      = 0.1 // s without a trigger after which an automatic one comes
)

// Scope says in what practice scopes differ. The zero Scope keeps to the dialect.
type Scope struct {
	Bits      int     // of the converter: 8 (or 0) or 12
	Bandwidth float64 // Hz; 0: 100 MHz
	Form      Form    // how records and measurements are told; empty: Standard
	Percent   bool    // duty is told in percent instead of as a ratio
	NoValue   string  // what is told where there is nothing to measure; empty: 9.91E37, the standard's not-a-number
	Tail      Tail    // behind a block; empty: NL
}

// Tail is what follows a block.
type Tail string

// The tails that makers' scopes have.
const (
	TailNL    Tail = "nl"
	TailNone  Tail = "none"
	TailCRNL  Tail = "crnl"
	TailTwoNL Tail = "two-nl"
)

// Tails are all of them.
func Tails() []Tail { return []Tail{TailNL, TailNone, TailCRNL, TailTwoNL} }

var tailBytes = map[Tail]string{"": "\n", TailNL: "\n", TailNone: "", TailCRNL: "\r\n", TailTwoNL: "\n\n"}

// scope is a digitising scope that keeps to the contract of the standard-scope dialect.
type scope struct {
	*scpi.Device
	bench  *Bench
	rng    *rand.Rand
	kind   Scope
	inputs [scopeInputs]input
	slid   atomic.Bool // the probes' slides have been moved
	loose  atomic.Bool // a clip has come off

	points   int
	duration float64
	source   int // channel that triggers; 0: immediate
	level    float64
	falling  bool
	auto     bool         // an automatic trigger where none comes
	running  *acquisition // newest; nil before the first
}

// input is one channel's settings, its place and its own errors.
type input struct {
	probe      circuit.Probe
	wired      bool
	fitted     float64 // the probe's own factor; 0: whatever the scope is told
	low, high  float64
	factor     float64
	coupling   string
	limited    bool    // 20 MHz
	gain, zero float64 // −1 … 1 of the limits
}

func newScope(b *Bench, r *rand.Rand, kind Scope, channels []Channel) *scope {
	s := &scope{Device: scpi.NewDevice(kind.identity(), 20), bench: b, rng: r, kind: kind.withDefaults()}
	for i := range s.inputs {
		s.inputs[i].gain, s.inputs[i].zero = 2*r.Float64()-1, 2*r.Float64()-1
	}
	for _, c := range channels {
		in := &s.inputs[c.Number-1]
		in.probe, in.wired, in.fitted = c.Probe, true, c.Factor
	}
	s.Reset = s.reset
	s.Pending = func() bool { return s.running != nil && !s.running.over() }
	s.Wait = func(ctx context.Context) error { return s.finish(ctx) }
	s.reset()
	s.registerInputs()
	s.registerSweep()
	s.registerTrigger()
	s.registerForm()
	s.registerMeasure()
	return s
}

func (k Scope) withDefaults() Scope {
	if k.Bits == 0 {
		k.Bits = 8
	}
	if k.Bandwidth == 0 {
		k.Bandwidth = 100e6
	}
	if k.Form == "" {
		k.Form = Standard
	}
	if k.NoValue == "" {
		k.NoValue = "9.91E37"
	}
	return k
}

// identity names the converter and the form too, since either needs a dialect of its own.
func (k Scope) identity() string {
	model := "practice-scope"
	if k.Bits == 12 {
		model = "practice-12-bit-scope"
	}
	if k.Form != "" && k.Form != Standard {
		model = "practice-" + string(k.Form) + "-scope"
	}
	return "Nightbench," + model + ",DS-1,1.0"
}

func (s *scope) reset() {
	s.abort()
	s.running = nil
	s.points, s.duration, s.source, s.level, s.falling, s.auto = 1000, 10e-3, 0, 0, false, false
	for i := range s.inputs {
		in := &s.inputs[i]
		in.low, in.high, in.factor, in.coupling, in.limited = -5, 5, 1, "DC", false
	}
}

func (s *scope) instrument() *Instrument {
	return &Instrument{
		device: s.Device, again: s.reset, mains: s.power,
		own: map[Kind]func() func(){LeadOff: toggle(&s.loose), ProbeTen: toggle(&s.slid)},
		answer: func(ctx context.Context, message []byte) []byte {
			if s.bench.world.clock.Sleep(ctx, seconds(scopeAnswer)) != nil {
				return nil
			}
			s.waitFor(ctx, message)
			return s.tail(s.Execute(ctx, message))
		},
		urgent: func(message []byte) bool {
			if !scpi.MatchHeader("ABORt", strings.TrimSpace(string(message))) {
				return false
			}
			s.bench.abortScope()
			return true
		},
	}
}

// toggle sets a switch, and takes it back.
func toggle(b *atomic.Bool) func() func() {
	return func() func() { b.Store(true); return func() { b.Store(false) } }
}

// power ends an acquisition when the mains goes.
func (s *scope) power(on bool) {
	if !on {
		s.bench.abortScope()
	}
}

// waitFor holds back what asks for a record while one is being taken.
func (s *scope) waitFor(ctx context.Context, message []byte) {
	text := strings.ToUpper(string(message))
	for _, word := range []string{"TRAC", "WAV", "CURV", "WF", "DATA", "MEAS"} {
		if strings.Contains(text, word) {
			_ = s.finish(ctx) // a bench that closes answers nothing
			return
		}
	}
}

func (s *scope) registerInputs() {
	in := func(c *scpi.Call) *input { return &s.inputs[c.Suffix[0]-1] }
	volts := scpi.Numeric{Unit: "V", Min: -1000, Max: 1000}
	s.Value("SENSe<1-4>:VOLTage[:DC]:RANGe:UPPer", volts, func(c *scpi.Call) float64 { return in(c).high },
		func(c *scpi.Call, v float64) error { in(c).high = v; return nil })
	s.Value("SENSe<1-4>:VOLTage[:DC]:RANGe:LOWer", volts, func(c *scpi.Call) float64 { return in(c).low },
		func(c *scpi.Call, v float64) error { in(c).low = v; return nil })
	s.Value("INPut<1-4>:ATTenuation", scpi.Numeric{Min: 1, Max: 1000, Default: 1}, func(c *scpi.Call) float64 { return in(c).factor },
		func(c *scpi.Call, v float64) error { in(c).factor = v; return nil })
	s.Set("INPut<1-4>:COUPling", func(c *scpi.Call) error { in(c).coupling = c.Word(0); return nil }, scpi.Choice{Words: []string{"DC", "AC", "GND"}})
	s.Get("INPut<1-4>:COUPling", func(c *scpi.Call) (string, error) { return in(c).coupling, nil })
	s.Set("INPut<1-4>:FILTer[:LPASs][:STATe]", func(c *scpi.Call) error { in(c).limited = c.Bool(0); return nil }, scpi.Boolean{})
	s.Get("INPut<1-4>:FILTer[:LPASs][:STATe]", func(c *scpi.Call) (string, error) { return scpi.Bit(in(c).limited), nil })
}

func (s *scope) registerSweep() {
	s.Value("SENSe:SWEep:POINts", scpi.Numeric{Min: fewestSamples, Max: mostSamples, Default: 1000, Integer: true},
		func(*scpi.Call) float64 { return float64(s.points) }, func(_ *scpi.Call, v float64) error { s.points = int(v); return nil })
	s.Value("SENSe:SWEep:TIME", scpi.Numeric{Unit: "S", Min: 1e-6, Max: 1000, Default: 10e-3},
		func(*scpi.Call) float64 { return s.duration }, func(_ *scpi.Call, v float64) error { s.duration = v; return nil })
	s.Get("SENSe:SWEep:TINTerval", func(*scpi.Call) (string, error) { return scpi.NR3(s.duration / float64(s.points)), nil })
	s.Set("FORMat[:DATA]", func(c *scpi.Call) error {
		if c.Number(1) != 16 {
			return scpi.NewFault(scpi.IllegalParameter, "only INT,16")
		}
		return nil
	}, scpi.Choice{Words: []string{"INTeger"}}, scpi.Numeric{Max: 64, Integer: true})
	s.Get("FORMat[:DATA]", func(*scpi.Call) (string, error) { return "INT,16", nil })
	s.Set("FORMat:BORDer", func(*scpi.Call) error { return nil }, scpi.Choice{Words: []string{"NORMal"}})
	s.Get("FORMat:BORDer", func(*scpi.Call) (string, error) { return "NORM", nil })
}

func (s *scope) registerTrigger() {
	words := []string{"IMMediate"}
	for c := 1; c <= scopeInputs; c++ {
		words = append(words, "CH"+strconv.Itoa(c))
	}
	s.Set("TRIGger:SOURce", func(c *scpi.Call) error {
		s.source = 0
		if n, ok := strings.CutPrefix(c.Word(0), "CH"); ok {
			s.source, _ = strconv.Atoi(n) // one of the words above
		}
		return nil
	}, scpi.Choice{Words: words})
	s.Get("TRIGger:SOURce", func(*scpi.Call) (string, error) {
		if s.source == 0 {
			return "IMM", nil
		}
		return "CH" + strconv.Itoa(s.source), nil
	})
	s.Value("TRIGger:LEVel", scpi.Numeric{Unit: "V", Min: -1000, Max: 1000}, func(*scpi.Call) float64 { return s.level },
		func(_ *scpi.Call, v float64) error { s.level = v; return nil })
	s.Set("TRIGger:SLOPe", func(c *scpi.Call) error { s.falling = c.Word(0) == "NEG"; return nil }, scpi.Choice{Words: []string{"POSitive", "NEGative"}})
	s.Get("TRIGger:SLOPe", func(*scpi.Call) (string, error) {
		if s.falling {
			return "NEG", nil
		}
		return "POS", nil
	})
	s.Set("TRIGger:ATRigger[:STATe]", func(c *scpi.Call) error { s.auto = c.Bool(0); return nil }, scpi.Boolean{})
	s.Get("TRIGger:ATRigger[:STATe]", func(*scpi.Call) (string, error) { return scpi.Bit(s.auto), nil })
	s.Get("TRIGger:STATe", func(*scpi.Call) (string, error) { return s.state(), nil })
	s.Set("INITiate[:IMMediate]", func(*scpi.Call) error { return s.start() })
	s.Set("ABORt", func(*scpi.Call) error { s.abort(); return nil })
}

// state is WAIT while a record is being taken, TD or AUTO when it was triggered or not, STOP without one.
func (s *scope) state() string {
	switch r := s.running; {
	case r == nil:
		return "STOP"
	case !r.over():
		return "WAIT"
	case !r.have:
		return "STOP"
	case r.source > 0 && r.triggered:
		return "TD"
	}
	return "AUTO"
}

// record is the last complete record.
func (s *scope) record() (*acquisition, error) {
	if s.running == nil || !s.running.over() || !s.running.have {
		return nil, scpi.NewFault(scpi.DataStale, "no record")
	}
	return s.running, nil
}

// start begins a new acquisition in a goroutine of the bench; the last record is gone.
func (s *scope) start() error {
	if s.Pending() {
		return scpi.NewFault(scpi.InitIgnored, "acquiring")
	}
	for i, in := range s.inputs {
		if in.wired && !(in.high > in.low) {
			return scpi.NewFault(scpi.SettingsConflict, fmt.Sprintf("SENS%d:VOLT:RANG", i+1))
		}
	}
	interval := s.duration / float64(s.points)
	if interval < 1/mostRate*(1-1e-9) {
		return scpi.NewFault(scpi.SettingsConflict, "more than 1 GS/s: SENS:SWE")
	}
	ctx, cancel := context.WithCancel(s.bench.ctx)
	a := &acquisition{cancel: cancel, done: make(chan struct{}), inputs: s.inputs, points: s.points, interval: interval,
		source: s.source, level: s.level, falling: s.falling, auto: s.auto, see: s.see}
	s.running = a
	s.bench.onAbort(cancel)
	s.bench.spawn(func() { defer close(a.done); defer cancel(); a.take(ctx, s.bench.world) })
	return nil
}

// finish waits until no acquisition is going on.
func (s *scope) finish(ctx context.Context) error {
	if s.running == nil {
		return nil
	}
	select {
	case <-s.running.done:
		return nil
	case <-ctx.Done():
		return ctx.Err()
	}
}

// abort ends an acquisition without a record.
func (s *scope) abort() {
	if s.running != nil {
		s.running.cancel()
		<-s.running.done
	}
}
