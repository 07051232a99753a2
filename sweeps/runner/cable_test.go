package runner_test

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"net"
	"os"
	"slices"
	"sync"
	"sync/atomic"

	"nightbench/instruments/practice"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
)

// schematic predicts as the daemon does, from fewer draws.
type schematic struct {
	*predict.Ensemble
	ohms float64 // of the motor with the current meter's burden
}

func (s schematic) At(supply, pot float64) (map[sweeps.Quantity]sweeps.Prediction, []sweeps.Flag) {
	return s.Ensemble.At(predict.Setting{Supply: supply, Pot: pot, Temperature: predict.Reference, Burden: 0.3})
}
func (s schematic) Curves([]sweeps.Setpoint) []sweeps.Curve { return nil }
func (s schematic) Tau() float64                            { return 5e-7 * s.ohms / (8e-3 * 8e-3) }
func (s schematic) Peak(supply float64) float64             { return supply / (s.ohms * 0.9) }

// spyMark is the energised record; it looks at the world at the moment it is set.
type spyMark struct {
	night *night
	mu    sync.Mutex
	set   bool
	early []string // what was wrong when it was set
	fail  error
}

func (m *spyMark) Set(run int64) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.fail != nil {
		return m.fail
	}
	if on, _ := m.night.output(); on {
		m.early = append(m.early, "the output was on before the record was made")
	}
	log, err := m.night.store.Log(context.Background(), run)
	if err != nil || !slices.ContainsFunc(log, func(e sweeps.Entry) bool { return e.Kind == sweeps.KindEnergising }) {
		m.early = append(m.early, fmt.Sprintf("the journal did not have it first (%v)", err))
	}
	m.set = true
	return nil
}

func (m *spyMark) Clear() error {
	m.mu.Lock()
	defer m.mu.Unlock()
	if on, _ := m.night.output(); on {
		m.early = append(m.early, "the record was cleared while the output was on")
	}
	m.set = false
	return nil
}

func (m *spyMark) isSet() bool { m.mu.Lock(); defer m.mu.Unlock(); return m.set }

// cable is one instrument's; it can be pulled, or swallow what is sent.
type cable struct {
	to    *practice.Instrument
	mute  atomic.Bool // bytes are lost both ways
	mu    sync.Mutex
	cut   bool
	plugs []net.Conn
}

func (c *cable) dial() (io.ReadWriteCloser, error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	if c.cut {
		return nil, os.ErrNotExist
	}
	here, there := net.Pipe()
	c.to.Serve(there)
	c.plugs = append(c.plugs, here)
	return muted{here, &c.mute}, nil
}

func (c *cable) pull() {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.cut = true
	for _, p := range c.plugs {
		p.Close()
	}
}

func (c *cable) plug() { c.mu.Lock(); c.cut = false; c.mu.Unlock() }

type muted struct {
	net.Conn
	mute *atomic.Bool
}

func (m muted) Write(b []byte) (int, error) {
	if m.mute.Load() {
		return len(b), nil
	}
	return m.Conn.Write(b)
}

func (m muted) Read(b []byte) (int, error) {
	n, err := m.Conn.Read(b)
	if err == nil && m.mute.Load() {
		return 0, nil
	}
	return n, err
}

// record is a log that can be read while it is written.
type record struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (r *record) Write(p []byte) (int, error) { r.mu.Lock(); defer r.mu.Unlock(); return r.b.Write(p) }
func (r *record) String() string              { r.mu.Lock(); defer r.mu.Unlock(); return r.b.String() }
