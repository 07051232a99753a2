package driver

import (
	"math"
	"testing"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/si"
)

// A dialect file of a user's own, with what those of the program do not use.
func TestOddSupply(t *testing.T) {
	inBubble(t, "IsSpokenTo", func(t *testing.T) {
		f := drivertest.Odd()
		d, err := dialect.Find(dialect.RoleSupply, "testdata/odd-supply.toml")
		must(t, err)
		o := SupplyOptions{Options: options("supply"), MaxVoltage: si.Volts(13), MaxCurrent: si.Amperes(1)}
		o.Channel = 2
		s, notes, err := OpenSupply(t.Context(), over(t, &f.Maker, d), d, o)
		must(t, err)
		if len(notes) != 0 {
			t.Errorf("noticed %v", notes)
		}
		id, err := s.Identify(t.Context())
		must(t, err)
		if !d.Matches(id) {
			t.Errorf("%q is not of its own dialect", id.Raw)
		}
		must(t, s.SetVoltage(t.Context(), si.Volts(5)))
		must(t, s.SetCurrentLimit(t.Context(), si.Amperes(0.25)))
		st, err := s.State(t.Context())
		must(t, err)
		if st.Output || st.Current.Outcome != instruments.NoMeasurement || !math.IsNaN(st.Current.Value) {
			t.Errorf("off: %+v", st)
		}
		must(t, s.SetOutput(t.Context(), true))
		st, err = s.State(t.Context())
		must(t, err)
		if !st.Output || st.Voltage.Value != 5 || st.Current.Value != 0.05 {
			t.Errorf("on: %+v", st)
		}
		if one, two := f.State(1), f.State(2); one.On || one.Volts != 0 || two.Volts != 5 || two.Limit != 0.25 {
			t.Errorf("channel 1 has %+v, channel 2 %+v", one, two)
		}
		must(t, s.SetVoltage(t.Context(), si.Volts(8)))
		st, err = s.State(t.Context())
		must(t, err)
		if st.Voltage.Outcome != instruments.Overload {
			t.Errorf("8 V on a meter for 6 V: %+v", st.Voltage)
		}
		must(t, s.within(0).done(t.Context()))
		must(t, s.tell(t.Context(), dialect.Line{Send: "FOO"}, s.put(0)))
		wants(t, s.clean(t.Context(), "set-up"), ErrComplained, "12", "what is FOO")
		must(t, s.SetOutput(t.Context(), false))
	})
}

// A value the instrument does not have is refused before anything is sent: the
// next one up could be too much for the board.
func TestValueThatIsNotAmongTheChoices(t *testing.T) {
	inBubble(t, "IsNotSent", func(t *testing.T) {
		f := drivertest.NewSupply()
		conn, _ := connect(t, &f.Listener, dialect.RoleSupply, "standard-supply")
		d := own(t, dialect.RoleSupply, "standard-supply", `ask = "VOLT?", step = "1 mV"`, `ask = "VOLT?", choices = [["5 V", "5"], ["12 V", "12"]], step = "1 mV"`)
		s, _, err := OpenSupply(t.Context(), conn, d, SupplyOptions{Options: options("supply"), MaxVoltage: si.Volts(13), MaxCurrent: si.Amperes(1)})
		must(t, err)
		must(t, s.SetVoltage(t.Context(), si.Volts(5)))
		wants(t, s.SetVoltage(t.Context(), si.Volts(9)), ErrRefused, "12\u00a0V only")
		if f.Count("VOLT 12") > 0 || f.Count("VOLT 9") > 0 {
			t.Errorf("sent %v", f.Received())
		}
	})
}
