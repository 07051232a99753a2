package app

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"nightbench/instruments"
	"nightbench/instruments/practice"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// PracticeOptions say what the practice bench is like.
type PracticeOptions struct {
	Board     sweeps.Board
	Wiring    instruments.Wiring // where the leads of the example bench are
	Clock     instruments.Clock
	Seed      uint64 // of the specimen and of the instruments' own errors
	TCP       bool   // on loopback sockets instead of pseudo-terminals
	SupplyLog string // path; empty: not kept
	Scenario  Scenario
	Truth     string             // path of the sealed file of true values; empty: not written
	Ports     string             // folder of names that stay when an instrument is plugged in anew; empty: the system's own names
	Log       func(words string) // hears of faults as they come; may be nil
}

// PracticeBench is a practice bench that is being served.
type PracticeBench struct {
	*practice.Bench
	Addresses []Served

	log io.Closer
}

// Served is one practice instrument and where it answers.
type Served struct{ Name, Role, Address string }

// OpenPractice draws a specimen of the board, puts it on simulated instruments, and serves those.
func OpenPractice(ctx context.Context, o PracticeOptions) (_ *PracticeBench, err error) {
	if o.Scenario.Seed != nil {
		o.Seed = *o.Scenario.Seed
	}
	s, err := newSpecimen(o.Board, o.Wiring.Pot, o.Seed)
	if err != nil {
		return nil, err
	}
	for _, x := range o.Scenario.Substitutes {
		if err := s.substitute(x); err != nil {
			return nil, err
		}
	}
	board, err := s.circuit(Burden(o.Wiring))
	if err != nil {
		return nil, err
	}
	c := practice.Config{Board: board, Clock: o.Clock, Seed: o.Seed, Climate: s.climate(), Supply: o.Scenario.Supply, Scope: o.Scenario.Scope}
	if o.Scenario.Climate != nil {
		c.Climate = *o.Scenario.Climate
	}
	if err := place(&c, o.Wiring); err != nil {
		return nil, err
	}
	if o.Wiring.Pot != nil {
		c.Pot.Track = s.potTrack()
	}
	p := &PracticeBench{}
	if o.SupplyLog != "" {
		f, err := os.OpenFile(o.SupplyLog, os.O_CREATE|os.O_WRONLY|os.O_APPEND, 0o600)
		if err != nil {
			return nil, fmt.Errorf("practice supply's log: %w", err)
		}
		c.SupplyLog, p.log = f, f
	}
	if p.Bench, err = practice.New(c); err != nil {
		return nil, err
	}
	if o.Truth != "" {
		if err := s.truth(o, c.Pot.Track, c.Climate).Seal(o.Truth); err != nil {
			return nil, errors.Join(err, p.Close())
		}
	}
	if err := p.serve(ctx, o); err != nil {
		return nil, err
	}
	return p, p.plan(o)
}

// plan has the scenario's faults come at their time.
func (p *PracticeBench) plan(o PracticeOptions) error {
	say := o.Log
	if say == nil {
		say = func(string) {}
	}
	for _, f := range o.Scenario.Faults {
		if err := p.Schedule(f.At, f.Fault, func(err error) { say(err.Error()) }); err != nil {
			return errors.Join(err, p.Close())
		}
	}
	return nil
}

func (p *PracticeBench) serve(ctx context.Context, o PracticeOptions) error {
	if o.Ports != "" {
		ports, err := filepath.Abs(o.Ports) // an address names the whole path
		if err == nil {
			err = os.MkdirAll(ports, 0o700)
		}
		if err != nil {
			return errors.Join(err, p.Close())
		}
		o.Ports = ports
	}
	for _, i := range p.Instruments() {
		open := i.ServePTY
		switch {
		case o.TCP:
			open = func() (string, error) { return i.ServeTCP(ctx, "127.0.0.1:0") }
		case o.Ports != "":
			open = func() (string, error) { return i.ServePTYAs(filepath.Join(o.Ports, i.Name)) }
		}
		address, err := open()
		if err != nil {
			return errors.Join(err, p.Close())
		}
		p.Addresses = append(p.Addresses, Served{i.Name, i.Role, address})
	}
	return nil
}

// Close ends the practice bench.
func (p *PracticeBench) Close() error {
	err := p.Bench.Close()
	if p.log != nil {
		p.log.Close()
	}
	return err
}

// place puts leads and probes where the wiring says.
func place(c *practice.Config, w instruments.Wiring) error {
	for _, m := range w.Meters {
		pm := practice.Meter{Name: m.Name, Unit: sweeps.Quantity(m.Reads).Unit(), InputResistance: m.InputResistance}
		if pm.Unit == si.Ampere {
			pm.Probe = circuit.Through(circuit.LoadCurrent)
		} else {
			p, err := between(m.Between)
			if err != nil {
				return err
			}
			pm.Probe = p
		}
		c.Meters = append(c.Meters, pm)
	}
	if w.Scope != nil {
		for _, ch := range w.Scope.Channels {
			p, err := between(ch.Between)
			if err != nil {
				return err
			}
			c.Channels = append(c.Channels, practice.Channel{Number: ch.Number, Probe: p, Factor: ch.Probe})
		}
	}
	if w.Pot != nil {
		c.Pot = practice.Pot{Codes: w.Pot.Codes, Track: w.Pot.EndToEnd, Wiper: w.Pot.Wiper, Start: w.Pot.Codes / 2}
	}
	return nil
}

func between(b instruments.Between) (circuit.Probe, error) {
	hi, err := circuit.ParseNode(string(b[0]))
	if err != nil {
		return circuit.Probe{}, err
	}
	lo, err := circuit.ParseNode(string(b[1]))
	return circuit.Between(hi, lo), err
}

// WriteBench writes the bench file of a practice bench: the example bench's text
// with the addresses it is served at, marked as practice, and its pace.
func (p *PracticeBench) WriteBench(dir, text string, pace float64) (string, error) {
	lines := strings.Split(text, "\n")
	n := 0
	for i, l := range lines {
		switch {
		case strings.HasPrefix(l, "address = "):
			if n >= len(p.Addresses) {
				return "", fmt.Errorf("the example bench names more instruments than the practice bench has")
			}
			lines[i] = fmt.Sprintf("address = %q", p.Addresses[n].Address)
			n++
		case strings.HasPrefix(l, "name = ") && n == 0:
			lines[i] = fmt.Sprintf("name = \"Practice bench\"\npractice = true\npace = %g", pace)
		}
	}
	path := filepath.Join(dir, "bench.toml")
	return path, os.WriteFile(path, []byte(strings.Join(lines, "\n")), 0o600)
}
