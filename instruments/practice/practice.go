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
	"sync/atomic"

	"nightbench/instruments"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// Config says what is on the practice bench.
type Config struct {
	Board     circuit.Board // true values
	Clock     instruments.Clock
	Seed      uint64    // of the instruments' own errors and noise
	Climate   Climate   // of the board
	Supply    Supply    // in what the supply differs
	Pot       Pot       // zero Codes: no pot
	Meters    []Meter   // in order
	Scope     Scope     // in what the scope differs
	Channels  []Channel // of the scope
	Cutoff    bool      // a relay in the supply lead that opens unless it is fed
	Probe     bool      // a thermometer on the board
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

	InputResistance float64 // Ω between its leads for volts; 0: 10 MΩ
	Series          float64 // Ω in the lead: a filter's or a divider's; 0: none
}

// Channel is one scope channel and where its tip is, against its clip.
type Channel struct {
	Number int
	Probe  circuit.Probe
	Factor float64 // of the probe fitted; 0: the one the scope is told
}

// Bench is a practice bench. Serve its instruments, then Close it.
type Bench struct {
	world *world
	all   []*Instrument

	ctx  context.Context
	end  context.CancelFunc
	wg   sync.WaitGroup
	mu   sync.Mutex
	open map[io.Closer]bool // guarded by mu
	stop context.CancelFunc // guarded by mu: ends the scope's acquisition

	faults struct {
		mu    sync.Mutex // guards all and noise
		all   []*inForce
		noise noise
	}
}

// Instrument is one of the bench's, to be served on a port.
type Instrument struct {
	Name string // "supply", "average", "scope", "pot"
	Role string // "supply", "meter", "scope", "pot"

	bench  *Bench
	device *scpi.Device
	answer func(ctx context.Context, message []byte) []byte
	urgent func(message []byte) bool     // obeyed at once, whatever is being waited for; may be nil
	mains  func(on bool)                 // what the mains going and coming does at once; may be nil
	again  func()                        // settings as at power-on, in turn; may be nil
	own    map[Kind]func() (lift func()) // the faults of its own

	turn chan struct{} // one slot: one message is carried out at a time
	dead atomic.Bool   // no mains

	mu   sync.Mutex // guards due and port
	due  []func()
	port port
}

// New builds the bench, output off.
func New(c Config) (*Bench, error) {
	for _, m := range c.Meters {
		m.loads(&c.Board)
	}
	sim, err := circuit.New(c.Board)
	if err != nil {
		return nil, fmt.Errorf("practice board: %w", err)
	}
	b := &Bench{world: &world{clock: c.Clock, sim: sim}, open: map[io.Closer]bool{}}
	b.ctx, b.end = context.WithCancel(context.Background())
	b.faults.noise = noise{rand.New(rand.NewPCG(c.Seed, 3))}
	rng := func(i uint64) *rand.Rand { return rand.New(rand.NewPCG(c.Seed, i)) }
	supply := newSupply(b.world, rng(1), c.Supply, &supplyLog{w: c.SupplyLog, world: b.world})
	b.add("supply", "supply", supply.instrument())
	for i, m := range c.Meters {
		b.add(m.Name, "meter", newMeter(b.world, rng(10+uint64(i)), m).instrument())
	}
	if len(c.Channels) > 0 {
		b.add("scope", "scope", newScope(b, rng(2), c.Scope, c.Channels).instrument())
	}
	b.world.expose(c.Climate)
	if c.Pot.Codes > 0 {
		b.add("pot", "pot", newPot(b.world, c.Pot).instrument())
	}
	if c.Cutoff {
		b.add("cutoff", "cutoff", newRelay(supply).instrument())
	}
	if c.Probe {
		b.add("probe", "thermometer", newThermometer(b.world, rng(4)).instrument())
	}
	return b, nil
}

func (b *Bench) add(name, role string, i *Instrument) {
	i.Name, i.Role, i.bench, i.turn = name, role, b, make(chan struct{}, 1)
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
	for c := range b.open {
		c.Close() // what it answers is of no use to anyone
	}
	b.open = nil
	b.mu.Unlock()
	b.wg.Wait()
	for _, i := range b.all {
		i.port.unname()
	}
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
