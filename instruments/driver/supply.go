package driver

import (
	"context"
	"fmt"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// SupplyOptions are what a supply is told. The limits are the bench's: what is
// above them is never sent, whoever asks.
type SupplyOptions struct {
	Options
	MaxVoltage si.Voltage
	MaxCurrent si.Current
}

// Supply is one channel of a bench supply.
type Supply struct {
	instrument
	limits  SupplyOptions
	foundOn bool
}

var _ instruments.Supply = (*Supply)(nil)

// OpenSupply makes the driver and looks at the instrument: error queue,
// opening lines, and whether its output is on already, which is stated in the
// notes and changed by nobody here.
func OpenSupply(ctx context.Context, conn *scpi.Conn, d *dialect.Dialect, o SupplyOptions) (*Supply, []string, error) {
	s := BareSupply(conn, d, o)
	notes, err := s.open(ctx)
	if err != nil {
		return nil, notes, err
	}
	if s.foundOn, err = s.flag(ctx, "output"); err != nil {
		return nil, notes, err
	}
	if s.foundOn {
		notes = append(notes, "its output was on already")
	}
	return s, notes, nil
}

// BareSupply makes the driver without saying a word to the instrument: enough
// to switch its output off.
func BareSupply(conn *scpi.Conn, d *dialect.Dialect, o SupplyOptions) *Supply {
	return &Supply{instrument: newInstrument(conn, d, o.Options), limits: o}
}

// FoundOn tells whether the output was on when the supply was opened.
func (s *Supply) FoundOn() bool { return s.foundOn }

// SetVoltage sets the output voltage.
func (s *Supply) SetVoltage(ctx context.Context, v si.Voltage) error {
	return s.limited(ctx, "voltage", v.SI(), s.limits.MaxVoltage.SI(), "max_voltage", si.Volt)
}

// SetCurrentLimit sets the current at which the supply stops holding its voltage.
func (s *Supply) SetCurrentLimit(ctx context.Context, i si.Current) error {
	return s.limited(ctx, "current_limit", i.SI(), s.limits.MaxCurrent.SI(), "max_current", si.Ampere)
}

// limited sets a value that must lie between zero and a limit of the bench.
func (s *Supply) limited(ctx context.Context, name string, v, most float64, key string, unit si.Unit) error {
	if !(v >= 0) || most > 0 && v > most*(1+1e-9) {
		return &Error{Instrument: s.name, Command: name + " " + si.Format(v, unit), Err: ErrLimit,
			Try: fmt.Sprintf("the bench file allows 0 to %s (%s)", si.Format(most, unit), key)}
	}
	_, err := s.set(ctx, name, s.put(v), unit)
	return err
}

// Protect sets the instrument's own over-voltage level, arms it where it has
// to be armed, and reads both back.
func (s *Supply) Protect(ctx context.Context, v si.Voltage) error {
	if !(v.SI() > 0) {
		return &Error{Instrument: s.name, Command: "over-voltage " + v.String(), Err: ErrRefused, Try: "give a level above 0 V"}
	}
	if _, err := s.set(ctx, "over_voltage", s.put(v.SI()), si.Volt); err != nil {
		return err
	}
	if s.has("over_voltage_arm") {
		return s.ensure(ctx, "over_voltage_arm", s.put(0))
	}
	return nil
}

// SetOutput switches the output and reads back its state.
func (s *Supply) SetOutput(ctx context.Context, on bool) error {
	name := map[bool]string{true: "on", false: "off"}[on]
	l, err := s.line(name)
	if err != nil {
		return err
	}
	if on && s.has("enable") {
		if err := s.ensure(ctx, "enable", s.put(0)); err != nil {
			return err
		}
	}
	if err := s.tell(ctx, l, s.put(0)); err != nil {
		return err
	}
	is, err := s.flag(ctx, "output")
	if err != nil || is == on {
		return err
	}
	refused := s.refused(ctx, s.put(0).Fill(l.Send), map[bool]string{true: "output on", false: "output off"}[is])
	if tripped, err := s.tripped(ctx); err == nil && tripped && on {
		refused.Err = fmt.Errorf("%w: %w", ErrRefused, ErrTripped)
		refused.Try = "find out why before clearing it: clearing may switch the output on again"
	}
	return refused
}

// Off sends the shortest output-off at once and waits for nothing. On a dead
// link it is sent again on a new one.
func (s *Supply) Off(ctx context.Context) error {
	if c := s.d.Channel; c != nil && c.Select != nil {
		if err := s.blind(ctx, *c.Select); err != nil {
			return err
		}
	}
	l, err := s.line("off")
	if err != nil {
		return err
	}
	return s.blind(ctx, l)
}

func (s *Supply) blind(ctx context.Context, l dialect.Line) error {
	command := s.put(0).Fill(l.Send)
	if err := s.conn.Blind(ctx, command); err != nil {
		return s.fault(command, err)
	}
	if s.lost.Swap(false) { // it has been opened anew on the way
		s.greet.Store(true)
	}
	return nil
}

// State looks at output, protection, regulation, voltage and current.
func (s *Supply) State(ctx context.Context) (st instruments.SupplyState, err error) {
	if st.Output, err = s.flag(ctx, "output"); err != nil {
		return st, err
	}
	if s.has("limiting") {
		if st.Limiting, err = s.flag(ctx, "limiting"); err != nil {
			return st, err
		}
		st.Limiting = st.Limiting && st.Output
	}
	if st.Tripped, err = s.tripped(ctx); err != nil {
		return st, err
	}
	if st.Voltage, err = s.measure(ctx, "measure_voltage", si.Volt); err != nil {
		return st, err
	}
	st.Current, err = s.measure(ctx, "measure_current", si.Ampere)
	return st, err
}

// tripped asks every protection the dialect can ask about.
func (s *Supply) tripped(ctx context.Context) (bool, error) {
	for _, name := range []string{"over_voltage_tripped", "over_current_tripped"} {
		if !s.has(name) {
			continue
		}
		if yes, err := s.flag(ctx, name); err != nil || yes {
			return yes, err
		}
	}
	return false, nil
}

// measure reads voltage or current at the terminals.
func (s *Supply) measure(ctx context.Context, name string, unit si.Unit) (instruments.Sample, error) {
	l, err := s.line(name)
	if err != nil {
		return instruments.Sample{}, err
	}
	n, err := s.number(ctx, l, s.put(0))
	if err != nil {
		return instruments.Sample{}, err
	}
	figure, _ := s.d.Figure(name, 0, s.channel)
	out := sample(n, unit)
	out.Range, out.Accuracy, out.At = figure.Range, figure.Accuracy, s.clock.Now()
	return out, nil
}
