package driver

import (
	"errors"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// asTheDialectSays opens a link to a maker's instrument with the settings of a dialect.
func asTheDialectSays(t *testing.T, m *drivertest.Maker, role dialect.Role, name string) (*scpi.Conn, *dialect.Dialect) {
	t.Helper()
	d, err := dialect.Find(role, name)
	must(t, err)
	return over(t, m, d), d
}

func over(t *testing.T, m *drivertest.Maker, d *dialect.Dialect) *scpi.Conn {
	t.Helper()
	addr, err := link.Parse("tcp://192.0.2.10:5025")
	must(t, err)
	k, err := link.Open(t.Context(), addr, link.Options{Dial: m.Dial, Terminator: d.Link.Terminator, ReplyEnd: d.Link.ReplyEnd,
		ClearBytes: d.Link.ClearBytes, Timeout: d.Link.Timeout})
	must(t, err)
	t.Cleanup(func() { must(t, k.Close()) })
	return scpi.New(k, Settings(d))
}

// families are the makers' supplies with what each can do.
var families = []struct {
	dialect                              string
	make                                 func() *drivertest.MakerSupply
	channel                              int
	protects, limits, clears, energising bool // energising: a clear switches it on again
}{
	{"keysight-e363x", drivertest.E3632A, 1, true, false, true, true},
	{"keysight-e364x", drivertest.E3646A, 2, true, false, true, true},
	{"keysight-e36300", drivertest.E36312A, 2, true, false, true, true},
	{"rigol-dp800", func() *drivertest.MakerSupply { return drivertest.DP832(false) }, 2, true, true, true, false},
	{"rigol-dp800", func() *drivertest.MakerSupply { return drivertest.DP832(true) }, 3, true, true, true, false},
	{"siglent-spd3303x", drivertest.SPD3303X, 2, false, true, false, false},
	{"gwinstek-gpd", drivertest.GPD3303S, 2, false, true, false, false},
	{"gwinstek-gpp", drivertest.GPP4323, 3, true, false, false, false},
	{"rs-nge100", drivertest.NGE103B, 2, true, false, true, false},
	{"aimtti-cpx", drivertest.CPX400DP, 2, true, false, true, false},
	{"keithley-2280s", drivertest.K2280S, 1, true, false, true, false},
}

func openMaker(t *testing.T, f *drivertest.MakerSupply, name string, channel int) (*Supply, []string) {
	t.Helper()
	conn, d := asTheDialectSays(t, &f.Maker, dialect.RoleSupply, name)
	o := SupplyOptions{Options: options("supply"), MaxVoltage: si.Volts(13), MaxCurrent: si.Amperes(1)}
	o.Channel = channel
	s, notes, err := OpenSupply(t.Context(), conn, d, o)
	must(t, err)
	return s, notes
}

// Every supply family against an instrument that was written from its manual's
// side: what is set is set, on the channel that is meant and on no other.
func TestMakersSupplies(t *testing.T) {
	for _, c := range families {
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			s, notes := openMaker(t, f, c.dialect, c.channel)
			if len(notes) != 0 || s.FoundOn() {
				t.Errorf("noticed %v", notes)
			}
			id, err := s.Identify(t.Context())
			must(t, err)
			if !s.d.Matches(id) {
				t.Errorf("%s is not of its own dialect", id)
			}
			must(t, s.SetVoltage(t.Context(), si.Volts(5)))
			must(t, s.SetCurrentLimit(t.Context(), si.Amperes(0.2)))
			must(t, s.SetOutput(t.Context(), true))
			if o := f.State(c.channel); !o.On || o.Volts != 5 || o.Limit != 0.2 {
				t.Errorf("the instrument has %+v", o)
			}
			st, err := s.State(t.Context())
			must(t, err)
			if !st.Output || st.Tripped || st.Limiting || math.Abs(st.Voltage.Value-5) > 1e-9 || math.Abs(st.Current.Value-0.05) > 1e-9 {
				t.Errorf("5 V into 100 Ω: state %+v", st)
			}
			if u := st.Voltage.Accuracy.Limit(5, 0); !(u > 0) {
				t.Errorf("limit of error %g V", u)
			}
			for n := range f.Out {
				if o := f.State(n + 1); n+1 != c.channel && (o.Volts != 0 || o.Limit != 1) {
					t.Errorf("channel %d was meant, channel %d has %+v", c.channel, n+1, o)
				}
			}
			f.Do(func() { f.Out[c.channel-1].Load = 10 })
			st, err = s.State(t.Context())
			must(t, err)
			if st.Limiting != c.limits || math.Abs(st.Voltage.Value-2) > 1e-9 {
				t.Errorf("0.2 A into 10 Ω: state %+v", st)
			}
			must(t, s.SetOutput(t.Context(), false))
			if f.State(c.channel).On {
				t.Error("still on")
			}
			must(t, s.Close(t.Context()))
		})
	}
}

func TestMakersProtections(t *testing.T) {
	for _, c := range families {
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			s, _ := openMaker(t, f, c.dialect, c.channel)
			err := s.Protect(t.Context(), si.Volts(6))
			if !c.protects {
				wants(t, err, dialect.ErrCannot, "over-voltage", c.dialect)
				return
			}
			must(t, err)
			if o := f.State(c.channel); o.Over != 6 || !o.Armed {
				t.Fatalf("the instrument has %+v", o)
			}
			must(t, s.SetVoltage(t.Context(), si.Volts(5)))
			must(t, s.SetOutput(t.Context(), true))
			f.Do(func() { f.Out[c.channel-1].Volts = 7 }) // somebody at the panel
			st, err := s.State(t.Context())
			must(t, err)
			if !st.Tripped || st.Output || st.Voltage.Value != 0 {
				t.Errorf("after an over-voltage: state %+v", st)
			}
			err = s.ClearTrip(t.Context())
			if !c.clears {
				wants(t, err, dialect.ErrCannot, "clear an over-voltage trip")
				return
			}
			must(t, err)
			if o := f.State(c.channel); o.On || o.TrippedOver {
				t.Errorf("after clearing: %+v", o)
			}
		})
	}
}

// A clear that switches on again is followed by off before anything else is said.
func TestClearThatEnergisesIsFollowedByOff(t *testing.T) {
	for _, c := range families {
		if !c.energising {
			continue
		}
		inBubble(t, c.dialect, func(t *testing.T) {
			f := c.make()
			s, _ := openMaker(t, f, c.dialect, c.channel)
			must(t, s.Protect(t.Context(), si.Volts(6)))
			must(t, s.SetOutput(t.Context(), true))
			f.Do(func() { f.Out[c.channel-1].Volts = 7 })
			if _, err := s.State(t.Context()); err != nil {
				t.Fatal(err)
			}
			f.Do(func() { f.Out[c.channel-1].Volts = 1 }) // the cause is gone
			must(t, s.ClearTrip(t.Context()))
			if o := f.State(c.channel); o.On || o.TrippedOver {
				t.Errorf("after clearing: %+v", o)
			}
			said := f.Received()
			clear := slices.IndexFunc(said, func(m string) bool { return strings.Contains(m, "PROT:CLE") })
			off := clear + slices.IndexFunc(said[clear:], func(m string) bool { return strings.Contains(m, "OUTP OFF") })
			if between := strings.Join(said[clear+1:off], " "); strings.Contains(between, "?") {
				t.Errorf("between clear and off was asked %s", between)
			}
		})
	}
}

func TestOverCurrentProtection(t *testing.T) {
	inBubble(t, "SetArmedTripped", func(t *testing.T) {
		f := drivertest.DP832(false)
		s, _ := openMaker(t, f, "rigol-dp800", 1)
		must(t, s.ProtectCurrent(t.Context(), si.Amperes(0.1)))
		if o := f.State(1); o.OverCurrent != 0.1 || !o.ArmedCurrent {
			t.Fatalf("the instrument has %+v", o)
		}
		must(t, s.SetVoltage(t.Context(), si.Volts(5)))
		must(t, s.SetOutput(t.Context(), true))
		f.Do(func() { f.Out[0].Load = 20 })
		st, err := s.State(t.Context())
		must(t, err)
		if !st.Tripped {
			t.Errorf("0.25 A through a protection of 0.1 A: %+v", st)
		}
		wants(t, s.ProtectCurrent(t.Context(), si.Amperes(0)), ErrRefused)
	})
	inBubble(t, "WhereThereIsNone", func(t *testing.T) {
		s, _ := openMaker(t, drivertest.GPP4323(), "gwinstek-gpp", 1)
		wants(t, s.ProtectCurrent(t.Context(), si.Amperes(0.1)), dialect.ErrCannot, "over-current")
	})
}

// What a family queues is told in its own words, and asked in its own way.
func TestMakersErrors(t *testing.T) {
	for name, c := range map[string]struct {
		dialect string
		make    func() *drivertest.MakerSupply
		says    string
	}{
		"WithNumberAndQuotes": {"keysight-e363x", drivertest.E3632A, "-113"},
		"WithoutComma":        {"siglent-spd3303x", drivertest.SPD3303X, "Unknown Command"},
		"TextAlone":           {"gwinstek-gpd", drivertest.GPD3303S, "Undefined Header."},
	} {
		inBubble(t, name, func(t *testing.T) {
			f := c.make()
			s, _ := openMaker(t, f, c.dialect, 1)
			must(t, s.conn.Write(t.Context(), "FOO 1"))
			wants(t, s.clean(t.Context(), "set-up"), ErrComplained, c.says)
			must(t, s.clean(t.Context(), "set-up"))
		})
	}
}

// Messages the instrument could not take are refused before they are sent.
func TestMessageLongerThanItsBuffer(t *testing.T) {
	inBubble(t, "Refused", func(t *testing.T) {
		f := drivertest.GPD3303S()
		s, _ := openMaker(t, f, "gwinstek-gpd", 1)
		must(t, s.SetVoltage(t.Context(), si.Volts(12.3456789))) // sent with three decimals
		if o := f.State(1); o.Volts != 12.346 {
			t.Errorf("set %g V", o.Volts)
		}
		err := s.tell(t.Context(), dialect.Line{Send: "VSET1:12.3456789"}, s.put(0))
		if !errors.Is(err, ErrRefused) {
			t.Errorf("16 characters: %v", err)
		}
	})
}

// After a link was lost the opening lines come again: an instrument that was
// switched off obeys nothing before them.
func TestOpeningLinesAfterALostLink(t *testing.T) {
	inBubble(t, "SentAgain", func(t *testing.T) {
		f := drivertest.E3632A()
		s, _ := openMaker(t, f, "keysight-e363x", 1)
		s.lost.Store(true)
		must(t, s.SetVoltage(t.Context(), si.Volts(3)))
		n := 0
		for _, m := range f.Received() {
			if m == "SYST:REM" {
				n++
			}
		}
		if n != 2 || f.State(1).Volts != 3 {
			t.Errorf("SYST:REM was sent %d times, %g V are set", n, f.State(1).Volts)
		}
	})
}

// The instrument is left alone for as long as it asks for after a line that takes it time.
func TestRestAfterALine(t *testing.T) {
	inBubble(t, "Kept", func(t *testing.T) {
		f := drivertest.GPD3303S()
		s, _ := openMaker(t, f, "gwinstek-gpd", 1)
		clock := instruments.NewClock(1)
		begun := clock.Now()
		must(t, s.SetOutput(t.Context(), true)) // OUT1 rests 400 ms, STATUS? takes 400 ms
		if took := clock.Now().Sub(begun); took < 800*time.Millisecond {
			t.Errorf("asked again after %v", took)
		}
	})
}
