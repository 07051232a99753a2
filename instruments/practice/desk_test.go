package practice

import (
	"bytes"
	"math"
	"net"
	"strconv"
	"strings"
	"sync"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"nightbench/instruments"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// desk is a practice bench in a bubble of time, with a person at each line: what is
// sent and what comes back are bytes.
type desk struct {
	*testing.T
	*Bench
	clock instruments.Clock
	lines map[string]net.Conn
	log   *diary
}

// diary is the supply's log, read while it is written.
type diary struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (d *diary) Write(p []byte) (int, error) {
	d.mu.Lock()
	defer d.mu.Unlock()
	return d.b.Write(p)
}

func (d *diary) String() string {
	d.mu.Lock()
	defer d.mu.Unlock()
	return d.b.String()
}

// steady is a board without a timer of its own: 1 kHz at a duty of 0.25 into 100 Ω, so
// that what the instruments must read is known beforehand.
func steady() circuit.Board {
	return circuit.Board{
		Source: circuit.Source{Resistance: 0.05, Bulk: 100e-6, Bleed: 470},
		Timing: circuit.Timing{Network: circuit.Clocked, Period: 1e-3, Duty: 0.25},
		Timer:  circuit.Timer{Threshold: 2. / 3, Trigger: 0.5, MinSupply: 2},
		Driver: circuit.Driver{Stage: circuit.NMOS, Resistance: 0.05},
		Load:   circuit.Load{Kind: circuit.Resistor, Resistance: 100},
	}
}

// timed is a dosing pump's timer and diodes with a resistor in the pump's place.
func timed() circuit.Board {
	signal := circuit.Diode{Is: 2.52e-9, N: 1.752, Rs: 0.568} // 1N4148 of the catalogue
	b := steady()
	b.Timing = circuit.Timing{Network: circuit.Steered, Common: 10e3, Down: 470, Pot: circuit.PotDown, Capacitance: 22e-9, ChargeDiode: &signal, DischargeDiode: &signal}
	b.Timer = circuit.Timer{Threshold: 2. / 3, Trigger: 0.5, Delay: 100e-9, DischargeResistance: 15, MinSupply: 3, Rise: 100e-9, Fall: 100e-9,
		Drop: circuit.Levels{{Supply: 9, Points: []circuit.Point{{Amps: 0, Volts: 1.2}, {Amps: 0.1, Volts: 1.7}}}},
		Low:  circuit.Levels{{Supply: 9, Points: []circuit.Point{{Amps: 0, Volts: 0.05}, {Amps: 0.1, Volts: 1}}}}}
	b.Driver = circuit.Driver{Stage: circuit.NMOS, Resistance: 0.05, RatedGate: 4.5, GateLevel: 1.5, Breakdown: 30, Edge: 50e-9}
	return b
}

// pump has the dosing pump's motor as well.
func pump() circuit.Board {
	b := timed()
	b.Flyback = &circuit.Diode{Is: 31.7e-6, N: 1.373, Rs: 0.051} // 1N5819 of the catalogue
	b.Driver.Body = &circuit.Diode{Is: 1e-11, N: 1.1, Rs: 0.03}
	b.Load = circuit.Load{Kind: circuit.Motor, Resistance: 12, Inductance: 5e-3, Constant: 8e-3, StaticTorque: 0.6e-3, CoulombTorque: 0.4e-3, ViscousTorque: 0.2e-6, Inertia: 5e-7, Burden: 0.3}
	return b
}

// atDesk runs f in a bubble, each instrument served on a pipe.
func atDesk(t *testing.T, board circuit.Board, f func(d *desk), change ...func(*Config)) {
	t.Helper()
	synctest.Test(t, func(t *testing.T) {
		d := &desk{T: t, clock: instruments.NewClock(1), lines: map[string]net.Conn{}, log: &diary{}}
		c := Config{
			Board: board, Clock: d.clock, Seed: 7, SupplyLog: d.log,
			Meters: []Meter{
				{Name: "average", Probe: circuit.Between(circuit.LoadHi, circuit.LoadLo), Unit: si.Volt},
				{Name: "motor", Probe: circuit.Through(circuit.LoadCurrent), Unit: si.Ampere},
			},
			Channels: []Channel{{Number: 1, Probe: circuit.Between(circuit.TimerOut, circuit.Common)}, {Number: 2, Probe: circuit.Between(circuit.LoadLo, circuit.Common)}},
			Pot:      Pot{Codes: 257, Track: 100e3, Wiper: 75, Start: 128},
		}
		for _, ch := range change {
			ch(&c)
		}
		var err error
		if d.Bench, err = New(c); err != nil {
			t.Fatal(err)
		}
		defer d.Close()
		for _, i := range d.Instruments() {
			ours, theirs := net.Pipe()
			defer ours.Close()
			i.Serve(theirs)
			d.lines[i.Name] = ours
		}
		d.tell("motor", `FUNC "CURR"`)
		f(d)
	})
}

// tell sends a message that has no reply.
func (d *desk) tell(name, message string) {
	d.Helper()
	if _, err := d.lines[name].Write([]byte(message + "\n")); err != nil {
		d.Fatalf("%s: %q: %v", name, message, err)
	}
	synctest.Wait()
}

// hear is all that comes within a time.
func (d *desk) hear(name string, within time.Duration) string {
	d.Helper()
	var all []byte
	buf := make([]byte, 1<<16)
	line := d.lines[name]
	line.SetReadDeadline(time.Now().Add(within))
	for {
		n, err := line.Read(buf)
		all = append(all, buf[:n]...)
		if err != nil {
			return string(all)
		}
	}
}

// ask sends a query and gives one line, or what came of it in 10 s.
func (d *desk) ask(name, query string) string {
	d.Helper()
	d.tell(name, query)
	var all []byte
	buf := make([]byte, 1<<16)
	line := d.lines[name]
	line.SetReadDeadline(time.Now().Add(10 * time.Second))
	for !bytes.HasSuffix(all, []byte("\n")) {
		n, err := line.Read(buf)
		all = append(all, buf[:n]...)
		if err != nil {
			return string(all)
		}
	}
	return strings.TrimSuffix(string(all), "\n")
}

// number is a reply that has to be one.
func (d *desk) number(name, query string) float64 {
	d.Helper()
	v, err := strconv.ParseFloat(d.ask(name, query), 64)
	if err != nil {
		d.Fatalf("%s: %s: %v", name, query, err)
	}
	return v
}

// bring injects a fault that must be possible.
func (d *desk) bring(f Fault) {
	d.Helper()
	if err := d.Inject(f); err != nil {
		d.Fatal(err)
	}
}

// on sets the supply and switches it on.
func (d *desk) on(volts string) {
	d.Helper()
	d.tell("supply", "CURR 1;:VOLT "+volts+";:OUTP ON")
	time.Sleep(2 * time.Second)
}

func (d *desk) near(what string, got, want, within float64) {
	d.Helper()
	if !(math.Abs(got-want) <= within) {
		d.Errorf("%s: %.7g, expected %.7g ± %.2g", what, got, want, within)
	}
}
