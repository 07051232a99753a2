package practice

import (
	"context"
	"encoding/binary"
	"fmt"
	"math/rand/v2"
	"strconv"
	"strings"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
)

// Figures of the practice scope, those of the standard-scope dialect.
const (
	scopeInputs   = 4
	mostSamples   = 1_000_000
	fewestSamples = 10
	codesAScreen  = 250.0 // LOW at −125, UPP at +125
	scopeGain     = 0.02  // limit of error
	scopeOffset   = 0.01  // limit, as a share of the screen
	scopeNoise    = 0.4   // rms, in codes
	scopeAnswer   = 3e-3  // s
	beforeTrigger = 0.1   // share of the record before the trigger
)

// scope is a digitising scope that keeps to the contract of the standard-scope dialect.
type scope struct {
	*scpi.Device
	bench  *Bench
	rng    *rand.Rand
	inputs [scopeInputs]input

	points   int
	duration float64
	source   int // channel that triggers; 0: immediate
	level    float64
	falling  bool
	running  *acquisition // newest; nil before the first
}

// input is one channel's settings, its place and its own errors.
type input struct {
	probe      circuit.Probe
	wired      bool
	low, high  float64
	factor     float64
	coupling   string
	gain, zero float64 // −1 … 1 of the limits
}

func newScope(b *Bench, r *rand.Rand, channels []Channel) *scope {
	s := &scope{Device: scpi.NewDevice("Nightbench,practice-scope,DS-1,1.0", 20), bench: b, rng: r}
	for i := range s.inputs {
		s.inputs[i].gain, s.inputs[i].zero = 2*r.Float64()-1, 2*r.Float64()-1
	}
	for _, c := range channels {
		s.inputs[c.Number-1].probe, s.inputs[c.Number-1].wired = c.Probe, true
	}
	s.Reset = s.reset
	s.Pending = func() bool { return s.running != nil && !s.running.over() }
	s.Wait = func(ctx context.Context) error { return s.finish(ctx) }
	s.reset()
	s.registerInputs()
	s.registerSweep()
	s.registerTrigger()
	s.registerTrace()
	return s
}

func (s *scope) reset() {
	s.abort()
	s.running = nil
	s.points, s.duration, s.source, s.level, s.falling = 1000, 10e-3, 0, 0, false
	for i := range s.inputs {
		in := &s.inputs[i]
		in.low, in.high, in.factor, in.coupling = -5, 5, 1, "DC"
	}
}

func (s *scope) instrument() *Instrument {
	return &Instrument{
		answer: func(ctx context.Context, message []byte) []byte {
			if s.bench.world.clock.Sleep(ctx, seconds(scopeAnswer)) != nil {
				return nil
			}
			s.waitFor(ctx, message)
			return s.Execute(ctx, message)
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

// waitFor holds back what arrives while a record is being taken, save what asks nothing of it.
func (s *scope) waitFor(ctx context.Context, message []byte) {
	if strings.Contains(strings.ToUpper(string(message)), "TRAC") {
		if s.finish(ctx) != nil {
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
}

func (s *scope) registerSweep() {
	s.Value("SENSe:SWEep:POINts", scpi.Numeric{Min: fewestSamples, Max: mostSamples, Default: 1000, Integer: true},
		func(*scpi.Call) float64 { return float64(s.points) }, func(_ *scpi.Call, v float64) error { s.points = int(v); return nil })
	s.Value("SENSe:SWEep:TIME", scpi.Numeric{Unit: "S", Min: 1e-6, Max: 1000, Default: 10e-3},
		func(*scpi.Call) float64 { return s.duration }, func(_ *scpi.Call, v float64) error { s.duration = v; return nil })
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
	s.Set("INITiate[:IMMediate]", func(*scpi.Call) error { return s.start() })
	s.Set("ABORt", func(*scpi.Call) error { s.abort(); return nil })
}

func (s *scope) registerTrace() {
	channel := scpi.Choice{Words: []string{"CH1", "CH2", "CH3", "CH4"}}
	s.Get("TRACe[:DATA]", func(c *scpi.Call) (string, error) {
		codes, err := s.codes(c.Word(0))
		if err != nil {
			return "", err
		}
		data := make([]byte, 0, 2*len(codes))
		for _, k := range codes {
			data = binary.BigEndian.AppendUint16(data, uint16(k))
		}
		return scpi.FormatBlock(data), nil
	}, channel)
	s.Get("TRACe:PREamble", func(c *scpi.Call) (string, error) {
		r, err := s.record()
		if err != nil {
			return "", err
		}
		in := r.inputs[c.Word(0)[2]-'1']
		return strings.Join([]string{strconv.Itoa(r.points), scpi.NR3(r.interval), scpi.NR3(r.origin),
			scpi.NR3((in.high - in.low) / codesAScreen), scpi.NR3((in.high + in.low) / 2)}, ","), nil
	}, channel)
}

// record is the last complete record.
func (s *scope) record() (*acquisition, error) {
	if s.running == nil || !s.running.over() || !s.running.have {
		return nil, scpi.NewFault(scpi.DataStale, "no record")
	}
	return s.running, nil
}

// codes are one channel's converter codes of the last record; digitised once, so that asking twice gives the same.
func (s *scope) codes(word string) ([]int16, error) {
	r, err := s.record()
	if err != nil {
		return nil, err
	}
	n := int(word[2] - '1')
	if r.codes[n] == nil {
		r.codes[n] = s.digitise(&r.inputs[n], r.y[n])
	}
	return r.codes[n], nil
}

// digitise turns volts at the tip into codes: errors of the channel, coupling, noise, steps, clipping.
func (s *scope) digitise(in *input, y []float64) []int16 {
	codes := make([]int16, len(y))
	mean := 0.0
	for _, v := range y {
		mean += v / float64(len(y))
	}
	span, middle := in.high-in.low, (in.high+in.low)/2
	for i, v := range y {
		switch in.coupling {
		case "AC":
			v -= mean
		case "GND":
			v = 0
		}
		v = v*(1+in.gain*scopeGain) + in.zero*scopeOffset*span
		k := quantise((v-middle)/span*codesAScreen+s.rng.NormFloat64()*scopeNoise, 1)
		codes[i] = int16(min(max(k, -128), 127))
	}
	return codes
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
	ctx, cancel := context.WithCancel(s.bench.ctx)
	a := &acquisition{cancel: cancel, done: make(chan struct{}), inputs: s.inputs, points: s.points, interval: s.duration / float64(s.points),
		source: s.source, level: s.level, falling: s.falling}
	s.running = a
	s.bench.onAbort(cancel)
	s.bench.wg.Go(func() { defer close(a.done); defer cancel(); a.take(ctx, s.bench.world) })
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
