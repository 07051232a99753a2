// Package practice is a simulated board on simulated instruments, served on real
// ports: a supply, meters, a scope and a pot behind a small bridge. Each parses the
// standard's message grammar, keeps an error queue, quantises, has errors of its own
// within its stated accuracy, and takes real time to answer. The board behind them is
// integrated in the time domain (package circuit) and knows nothing of predictions.
package practice

import (
	"context"
	"fmt"
	"io"
	"math/rand/v2"
	"sync"

	"nightbench/instruments"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
)

// Config says what is on the practice bench.
type Config struct {
	Board     circuit.Board // true values
	Clock     instruments.Clock
	Seed      uint64    // of the instruments' own errors and noise
	Pot       Pot       // zero Codes: no pot
	Meters    []Meter   // in order
	Channels  []Channel // of the scope
	SupplyLog io.Writer // what the supply was told and when its output was on, a JSON object a line; nil: not kept
}

// Pot is the true pot: a track of Codes positions.
type Pot struct {
	Codes int
	Track float64 // Ω, true
	Wiper float64 // Ω
	Start int     // code at power-on
}

// Meter is one multimeter and where its leads are.
type Meter struct {
	Name  string
	Probe circuit.Probe
	Unit  si.Unit // Volt or Ampere
}

// Channel is one scope channel and where its tip is, against its clip.
type Channel struct {
	Number int
	Probe  circuit.Probe
}

// Bench is a practice bench. Serve its instruments, then Close it.
type Bench struct {
	world *world
	all   []*Instrument

	ctx  context.Context
	end  context.CancelFunc
	wg   sync.WaitGroup
	mu   sync.Mutex
	open []io.Closer        // guarded by mu
	stop context.CancelFunc // guarded by mu: ends the scope's acquisition
}

// Instrument is one of the bench's, to be served on a port.
type Instrument struct {
	Name string // "supply", "average", "scope", "pot"
	Role string // "supply", "meter", "scope", "pot"

	bench  *Bench
	answer func(ctx context.Context, message []byte) []byte
	urgent func(message []byte) bool // obeyed at once, whatever is being waited for
}

// New builds the bench, output off.
func New(c Config) (*Bench, error) {
	sim, err := circuit.New(c.Board)
	if err != nil {
		return nil, fmt.Errorf("practice board: %w", err)
	}
	b := &Bench{world: &world{clock: c.Clock, sim: sim}}
	b.ctx, b.end = context.WithCancel(context.Background())
	rng := func(i uint64) *rand.Rand { return rand.New(rand.NewPCG(c.Seed, i)) }
	b.add("supply", "supply", newSupply(b.world, rng(1), c.SupplyLog).instrument())
	for i, m := range c.Meters {
		b.add(m.Name, "meter", newMeter(b.world, rng(10+uint64(i)), m).instrument())
	}
	if len(c.Channels) > 0 {
		b.add("scope", "scope", newScope(b, rng(2), c.Channels).instrument())
	}
	if c.Pot.Codes > 0 {
		b.add("pot", "pot", newPot(b.world, c.Pot).instrument())
	}
	return b, nil
}

func (b *Bench) add(name, role string, i *Instrument) {
	i.Name, i.Role, i.bench = name, role, b
	b.all = append(b.all, i)
}

// Instruments are all instruments: the supply first.
func (b *Bench) Instruments() []*Instrument { return b.all }

// Alter changes the true board while it runs: for tests of what a bench must notice.
func (b *Bench) Alter(f func(*circuit.Board)) (err error) {
	b.world.do(func(s *circuit.Sim) { err = s.Change(f) })
	return err
}

// Close ends all ports and waits for what serves them.
func (b *Bench) Close() error {
	b.end()
	b.mu.Lock()
	for _, c := range b.open {
		c.Close() // what it answers is of no use to anyone
	}
	b.open = nil
	b.mu.Unlock()
	b.wg.Wait()
	return nil
}

// onAbort remembers how to end the scope's acquisition from outside its turn.
func (b *Bench) onAbort(stop context.CancelFunc) {
	b.mu.Lock()
	defer b.mu.Unlock()
	b.stop = stop
}

// abortScope ends the scope's acquisition, if one is going on.
func (b *Bench) abortScope() {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.stop != nil {
		b.stop()
	}
}
