package driver

import (
	"testing"

	"nightbench/instruments/dialect"
	"nightbench/instruments/link"
	"nightbench/instruments/link/linktest"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// An exchange log of a supply that spells everything otherwise: the channel is
// selected before every line, replies carry units and end with CR NL, the state
// is bits of hexadecimal text, there is no error queue and no *OPC?.
const twoChannelLog = `
> *IDN?\r\n
< GROWHOUSE TWIN V1.0 SN:0042\r\n
> *IDN?\r\n
< GROWHOUSE TWIN V1.0 SN:0042\r\n
# open: is the output on?
> INST CH2\r\n
> SYST:STAT?\r\n
< 0x0204\r\n
# set 5 V, read back
> INST CH2\r\n
> CH2:VOLT 5\r\n
> INST CH2\r\n
> CH2:VOLT?\r\n
< 5.00V\r\n
# output on
> INST CH2\r\n
> OUTP CH2,ON\r\n
> INST CH2\r\n
> SYST:STAT?\r\n
< 0x0224\r\n
# state
> INST CH2\r\n
> SYST:STAT?\r\n
< 0x0224\r\n
> INST CH2\r\n
> MEAS:VOLT? CH2\r\n
< 4.998V\r\n
> INST CH2\r\n
> MEAS:CURR? CH2\r\n
< 0.250A\r\n
# off, blind: select and off, nothing else
> INST CH2\r\n
> OUTP CH2,OFF\r\n
# closing
> LOCAL\r\n
`

func TestTwoChannelSupplyFollowsItsLog(t *testing.T) {
	d, err := dialect.Find(dialect.RoleSupply, "testdata/two-channel-supply.toml")
	must(t, err)
	inBubble(t, "FromOpeningToClosing", func(t *testing.T) {
		l := linktest.Open(t, twoChannelLog, link.Options{Terminator: d.Link.Terminator})
		o := options("supply")
		o.Channel = 2
		s, notes, err := OpenSupply(t.Context(), scpi.New(l, Settings(d)), d, SupplyOptions{Options: o, MaxVoltage: si.Volts(13), MaxCurrent: si.Amperes(1)})
		must(t, err)
		if len(notes) > 0 {
			t.Errorf("notes %v", notes)
		}
		must(t, s.SetVoltage(t.Context(), si.Volts(5)))
		must(t, s.SetOutput(t.Context(), true))
		st, err := s.State(t.Context())
		must(t, err)
		if !st.Output || st.Limiting || st.Tripped || st.Voltage.Value != 4.998 || st.Voltage.Raw != "4.998V" || st.Current.Value != 0.25 {
			t.Errorf("%+v", st)
		}
		must(t, s.Off(t.Context()))
		wants(t, s.Protect(t.Context(), si.Volts(6)), dialect.ErrCannot, "supply", "two-channel-supply can't set an over-voltage level")
		must(t, s.Close(t.Context()))
	})
}

// A meter on a serial line that answers CR NL and is late once.
const lateMeterLog = `
> *IDN?\n
< GROWHOUSE,DM-1,0,1.0\r\n
> *OPC?\n
< 1\r\n
> SYST:ERR?\n
< +0,"No error"\r\n
> *RST\n
> *OPC?\n
< 1\r\n
> *CLS\n
> *OPC?\n
< 1\r\n
> SYST:ERR?\n
< +0,"No error"\r\n
> FUNC "VOLT:DC"\n
> FUNC?\n
< "VOLT"\r\n
> VOLT:DC:RANG 10.8\n
> VOLT:DC:RANG?\n
< +1.00000000E+02\r\n
> VOLT:DC:NPLC 10\n
> VOLT:DC:NPLC?\n
< +1.00000000E+01\r\n
> SYST:ERR?\n
< +0,"No error"\r\n
# before each reading the settings are read back
> VOLT:DC:RANG?\n
< +1.00000000E+02\r\n
> VOLT:DC:NPLC?\n
< +1.00000000E+01\r\n
> FUNC?\n
< "VOLT"\r\n
> READ?\n
. 5s
< +4.35000000E+00\r\n
# out of step: proof, then the settings, then a new reading
> *IDN?\n
< GROWHOUSE,DM-1,0,1.0\r\n
> *OPC?\n
< 1\r\n
> VOLT:DC:RANG?\n
< +1.00000000E+02\r\n
> VOLT:DC:NPLC?\n
< +1.00000000E+01\r\n
> FUNC?\n
< "VOLT"\r\n
> READ?\n
< -9.90000000E+37\r\n
`

func TestLateMeterFollowsItsLog(t *testing.T) {
	d, err := dialect.Find(dialect.RoleMeter, "standard-meter")
	must(t, err)
	inBubble(t, "LateOnceThenOverloaded", func(t *testing.T) {
		l := linktest.Open(t, lateMeterLog, link.Options{})
		m, _, err := OpenMeter(t.Context(), scpi.New(l, Settings(d)), d, MeterOptions{Options: options("meter average")})
		must(t, err)
		got, err := m.Configure(t.Context(), volts(10.8, 0.2))
		must(t, err)
		if got.Range != 100 || got.Aperture != 0.2 {
			t.Errorf("in force %+v", got)
		}
		_, err = m.Read(t.Context())
		wants(t, err, link.ErrTimeout, "READ?")
		t.Log(err)
		pause(t, 4)
		s, err := m.Read(t.Context())
		must(t, err)
		if s.Outcome != "overload" || s.Raw != "-9.90000000E+37" {
			t.Errorf("%+v", s)
		}
	})
}
