package driver

import (
	"cmp"
	"context"
	"fmt"
	"math"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// MeterOptions are what a meter is told.
type MeterOptions struct {
	Options
	Accuracy      *instruments.Accuracy // the bench file's figure; nil: the dialect's
	LineFrequency float64               // Hz, of the power line; 0 means 50
}

// Meter is a multimeter that integrates over its aperture.
type Meter struct {
	instrument
	own  *instruments.Accuracy
	line float64

	set  instruments.MeterSettings // in force; the zero value before Configure
	next instruments.Accuracy      // of the readings to come
}

var _ instruments.Meter = (*Meter)(nil)

// OpenMeter makes the driver and brings the meter to a known state.
func OpenMeter(ctx context.Context, conn *scpi.Conn, d *dialect.Dialect, o MeterOptions) (*Meter, []string, error) {
	m := &Meter{instrument: newInstrument(conn, d, o.Options), own: o.Accuracy, line: cmp.Or(o.LineFrequency, 50)}
	notes, err := m.open(ctx)
	if err == nil {
		err = m.reset(ctx)
	}
	if err == nil {
		err = m.clean(ctx, "opening")
	}
	if err != nil {
		return nil, notes, err
	}
	return m, notes, nil
}

// defaultAperture is what a request without one means, s: ten periods of a
// 50 Hz line, where bench meters are specified.
const defaultAperture = 0.2

// words of a function, by the unit it measures.
var functions = map[si.Unit]string{si.Volt: "voltage", si.Ampere: "current"}

// Configure sets function, fixed range and aperture, and answers what is in force.
func (m *Meter) Configure(ctx context.Context, want instruments.MeterSettings) (instruments.MeterSettings, error) {
	m.set = instruments.MeterSettings{}
	of, ok := functions[want.Unit]
	if !ok {
		return m.set, fmt.Errorf("%s: it measures V or A, not %q", m.name, want.Unit)
	}
	if !(want.Range > 0) {
		return m.set, fmt.Errorf("%s: give the least full scale wanted: measuring is never done with auto-range", m.name)
	}
	slow := m.within(m.bench(m.d.Meter.RangeTime.Seconds()))
	if err := slow.ensure(ctx, of+"_function", m.put(0)); err != nil {
		return m.set, err
	}
	full, err := m.setRange(ctx, slow, of, want)
	if err != nil {
		return m.set, err
	}
	speed, aperture, err := m.setSpeed(ctx, slow, of, cmp.Or(want.Aperture, defaultAperture))
	if err != nil {
		return m.set, err
	}
	if err := m.clean(ctx, "set-up for "+of); err != nil {
		return m.set, err
	}
	m.shaken.Store(false)
	m.set = instruments.MeterSettings{Unit: want.Unit, Range: full, Aperture: aperture}
	m.next = m.accuracy(of, full, speed)
	return m.set, nil
}

// setRange sets the range and takes any at or above what was wanted.
func (m *Meter) setRange(ctx context.Context, slow *instrument, of string, want instruments.MeterSettings) (float64, error) {
	p := m.put(want.Range)
	l, found, err := slow.assign(ctx, of+"_range", p)
	if err != nil {
		return 0, err
	}
	if found < want.Range*(1-1e-6) {
		return 0, m.refused(ctx, p.Fill(l.Send), "a range of "+si.Format(found, want.Unit))
	}
	return found, nil
}

// setSpeed sets the speed whose aperture is nearest (in ratio) to what was wanted, s.
func (m *Meter) setSpeed(ctx context.Context, slow *instrument, of string, aperture float64) (dialect.Speed, float64, error) {
	var best dialect.Speed
	least := math.Inf(1)
	for _, s := range m.d.Speeds {
		if off := math.Abs(math.Log(m.seconds(s.Setting) / aperture)); off < least {
			best, least = s, off
		}
	}
	if !m.has(of + "_speed") {
		return best, aperture, nil
	}
	found, err := slow.set(ctx, of+"_speed", m.put(best.Setting), si.One)
	return best, m.seconds(found), err
}

// seconds is the aperture of a speed setting, s.
func (m *Meter) seconds(setting float64) float64 {
	if m.d.Meter.SpeedFrom == "aperture" {
		return setting
	}
	return setting / m.line
}

// accuracy is the limit of error on a range at a speed; the bench file's
// figure wins, the resolution stays the dialect's where it states none.
func (m *Meter) accuracy(of string, full float64, speed dialect.Speed) instruments.Accuracy {
	figure, _ := m.d.Figure(of, full, m.channel)
	a := figure.Accuracy
	a.Range += speed.Adds
	a.Resolution = max(a.Resolution, speed.Resolution*full)
	if m.own == nil {
		return a
	}
	own := *m.own
	own.Resolution = cmp.Or(own.Resolution, a.Resolution)
	return own
}

// verify reads the settings back after an exchange failed: the
// instrument may have been switched off and on, or another person at its panel.
func (m *Meter) verify(ctx context.Context) error {
	of := functions[m.set.Unit]
	for _, want := range []struct {
		name string
		si   float64
		of   func(float64) float64
	}{{of + "_range", m.set.Range, nil}, {of + "_speed", m.set.Aperture, m.seconds}} {
		if !m.has(want.name) {
			continue
		}
		l, err := m.instrument.line(want.name)
		if err != nil {
			return err
		}
		found, err := m.measured(ctx, l, m.put(0))
		if err != nil {
			return err
		}
		if want.of != nil {
			found = want.of(found)
		}
		if !l.Agrees(want.si, found) {
			m.set = instruments.MeterSettings{}
			return &Error{Instrument: m.name, Command: l.Ask, Found: dialect.Number(found), Err: ErrSettingsLost,
				Try: "was it switched off and on? configure it again"}
		}
	}
	return m.sameFunction(ctx, of)
}

// sameFunction is verify for the function.
func (m *Meter) sameFunction(ctx context.Context, of string) error {
	l, err := m.instrument.line(of + "_function")
	if err != nil || l.Ask == "" {
		return err
	}
	found, err := m.word(ctx, l, m.put(0))
	if err != nil {
		return err
	}
	if !m.wanted(l, m.put(0), found) {
		m.set = instruments.MeterSettings{}
		return &Error{Instrument: m.name, Command: l.Ask, Found: found, Err: ErrSettingsLost,
			Try: "was it switched off and on? configure it again"}
	}
	return nil
}

// Read takes a new reading, which lasts an aperture, or two with auto-zero.
// Range, speed and function are read back first: a knob may have been turned
// at the front panel. Overload is an outcome, not an error.
func (m *Meter) Read(ctx context.Context) (instruments.Sample, error) {
	if m.set.Unit == "" {
		return instruments.Sample{}, fmt.Errorf("%s: %w", m.name, ErrNotConfigured)
	}
	if err := m.verify(ctx); err != nil {
		return instruments.Sample{}, err
	}
	m.shaken.Store(false)
	name := "read"
	if own := functions[m.set.Unit] + "_read"; m.has(own) {
		name = own
	}
	l, err := m.instrument.line(name)
	if err != nil {
		return instruments.Sample{}, err
	}
	n, err := m.within(m.readingTime()).number(ctx, l, m.put(0))
	if err != nil {
		return instruments.Sample{}, err
	}
	s := sample(n, m.set.Unit)
	s.Range, s.Aperture, s.Accuracy, s.At = m.set.Range, m.set.Aperture, m.next, m.clock.Now()
	return s, nil
}
