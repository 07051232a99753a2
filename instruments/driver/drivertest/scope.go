package drivertest

import (
	"context"
	"encoding/binary"
	"fmt"
	"math"
	"strconv"
	"sync"
	"time"

	"nightbench/instruments/scpi"
)

// Scope is a scope of two channels on a function of time.
type Scope struct {
	Listener
	Signal  func(channel int, t float64) float64 // V at the tip; nil: 0 V
	Dead    bool                                 // no trigger ever comes
	Mangled bool                                 // the block is a sample short

	mu       sync.Mutex // guards what follows
	words    map[string]string
	numbers  map[string]float64
	shot     *shot
	ended    chan struct{} // closed when the acquisition in progress ends
	pressing chan struct{} // closed by ABOR
}

// shot is one record.
type shot struct {
	origin, step float64
	low, high    [3]float64
	codes        [3][]int16
}

// NewScope makes a scope that has just been switched on.
func NewScope() *Scope {
	s := &Scope{}
	d := scpi.NewDevice("Nightbench,practice-scope,T3,1.0", 20)
	d.Status.TakeEvents()
	s.Device, d.Reset, d.Wait = d, s.PowerOn, s.wait
	s.PowerOn()
	s.AtOnce = s.obeyAbort
	for name, header := range map[string]string{
		"high": "SENSe<1-2>:VOLTage:RANGe:UPPer", "low": "SENSe<1-2>:VOLTage:RANGe:LOWer", "att": "INPut<1-2>:ATTenuation",
		"points": "SENSe:SWEep:POINts", "time": "SENSe:SWEep:TIME", "level": "TRIGger:LEVel",
	} {
		s.number(name, header)
	}
	for name, w := range map[string]struct {
		header string
		words  []string
	}{
		"coupling": {"INPut<1-2>:COUPling", []string{"DC", "AC", "GND"}}, "source": {"TRIGger:SOURce", []string{"CH1", "CH2", "IMMediate"}},
		"slope": {"TRIGger:SLOPe", []string{"POSitive", "NEGative"}}, "order": {"FORMat:BORDer", []string{"NORMal", "SWAPped"}},
	} {
		s.word(name, w.header, w.words)
	}
	d.Set("FORMat[:DATA]", func(*scpi.Call) error { return nil }, scpi.Choice{Words: []string{"INTeger"}}, scpi.Numeric{Min: 16, Max: 16})
	d.Get("FORMat[:DATA]", func(*scpi.Call) (string, error) { return "INT,16", nil })
	d.Set("INITiate[:IMMediate]", s.start)
	channel := scpi.Choice{Words: []string{"CH1", "CH2"}}
	d.Get("TRACe:PREamble", s.preamble, channel)
	d.Get("TRACe[:DATA]", s.trace, channel)
	return s
}

// PowerOn forgets all settings and the record.
func (s *Scope) PowerOn() {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.shot = nil
	s.words = map[string]string{"coupling1": "AC", "coupling2": "AC", "source": "IMM", "slope": "NEG", "order": "SWAP"}
	s.numbers = map[string]float64{"high1": 5, "low1": -5, "high2": 5, "low2": -5, "att1": 1, "att2": 1, "points": 1000, "time": 0.01}
}

// key is a setting's name with its channel, where it has one.
func key(name string, c *scpi.Call) string {
	if len(c.Suffix) > 0 {
		return name + strconv.Itoa(c.Suffix[0])
	}
	return name
}

func (s *Scope) number(name, header string) {
	s.Device.Set(header, func(c *scpi.Call) error {
		s.mu.Lock()
		defer s.mu.Unlock()
		s.numbers[key(name, c)] = c.Number(0)
		return nil
	}, scpi.Numeric{Min: -1e6, Max: 1e6})
	s.Device.Get(header, func(c *scpi.Call) (string, error) {
		s.mu.Lock()
		defer s.mu.Unlock()
		return scpi.NR3(s.numbers[key(name, c)]), nil
	})
}

func (s *Scope) word(name, header string, words []string) {
	s.Device.Set(header, func(c *scpi.Call) error {
		s.mu.Lock()
		defer s.mu.Unlock()
		s.words[key(name, c)] = c.Word(0)
		return nil
	}, scpi.Choice{Words: words})
	s.Device.Get(header, func(c *scpi.Call) (string, error) {
		s.mu.Lock()
		defer s.mu.Unlock()
		return s.words[key(name, c)], nil
	})
}

// start begins an acquisition that ends by itself, or waits for a trigger that never comes.
func (s *Scope) start(*scpi.Call) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	ended, pressing := make(chan struct{}), make(chan struct{})
	s.shot, s.ended, s.pressing = nil, ended, pressing
	waits := s.Dead && s.words["source"] != "IMM"
	takes := time.Duration(s.numbers["time"] * float64(time.Second))
	go func() {
		defer close(ended)
		if waits {
			<-pressing
			return
		}
		time.Sleep(takes)
		s.mu.Lock()
		defer s.mu.Unlock()
		s.shot = s.record()
	}()
	return nil
}

// obeyAbort ends an acquisition without a record.
func (s *Scope) obeyAbort(message string) bool {
	if message != "ABOR" {
		return false
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.pressing != nil {
		close(s.pressing)
		s.pressing = nil
	}
	return true
}

// wait is what holds *OPC? back.
func (s *Scope) wait(ctx context.Context) error {
	s.mu.Lock()
	ended := s.ended
	s.mu.Unlock()
	if ended == nil {
		return nil
	}
	select {
	case <-ended:
		return nil
	case <-ctx.Done():
		return ctx.Err()
	}
}

// record samples both channels. The trigger is taken to be at t = 0.
func (s *Scope) record() *shot {
	n := int(s.numbers["points"])
	r := &shot{step: s.numbers["time"] / float64(n)}
	if s.words["source"] != "IMM" {
		r.origin = -s.numbers["time"] / 10
	}
	for c := 1; c <= 2; c++ {
		r.low[c], r.high[c] = s.numbers[fmt.Sprint("low", c)], s.numbers[fmt.Sprint("high", c)]
		for i := range n {
			v := 0.0
			if s.Signal != nil {
				v = s.Signal(c, r.origin+float64(i)*r.step)
			}
			code := math.Round((v - (r.high[c]+r.low[c])/2) / (r.high[c] - r.low[c]) * 250)
			r.codes[c] = append(r.codes[c], int16(min(max(code, -128), 127)))
		}
	}
	return r
}

// last is the last record and the channel a query is about.
func (s *Scope) last(c *scpi.Call) (*shot, int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.shot == nil {
		return nil, 0, scpi.NewFault(scpi.DataStale, "no record")
	}
	return s.shot, int(c.Word(0)[2] - '0'), nil
}

func (s *Scope) preamble(c *scpi.Call) (string, error) {
	r, n, err := s.last(c)
	if err != nil {
		return "", err
	}
	return fmt.Sprintf("%d,%s,%s,%s,%s", len(r.codes[n]), scpi.NR3(r.step), scpi.NR3(r.origin),
		scpi.NR3((r.high[n]-r.low[n])/250), scpi.NR3((r.high[n]+r.low[n])/2)), nil
}

func (s *Scope) trace(c *scpi.Call) (string, error) {
	r, n, err := s.last(c)
	if err != nil {
		return "", err
	}
	var data []byte
	for _, code := range r.codes[n] {
		data = binary.BigEndian.AppendUint16(data, uint16(code))
	}
	if s.Mangled {
		data = data[2:]
	}
	return scpi.FormatBlock(data), nil
}
