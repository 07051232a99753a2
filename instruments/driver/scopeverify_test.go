package driver

import (
	"testing"

	"nightbench/instruments/driver/drivertest"
)

// Whatever makes volts of a channel's codes is read back: a knob turned at the panel is
// found before the channels' second record at the latest.
func TestTurnedKnobIsFound(t *testing.T) {
	for _, knob := range []struct{ turned, asked, found string }{
		{"SENS1:VOLT:RANG:UPP 6", "SENS1:VOLT:RANG:UPP?", "6"},
		{"SENS1:VOLT:RANG:LOW -2", "SENS1:VOLT:RANG:LOW?", "−2"},
		{"SENS2:VOLT:RANG:UPP 10", "SENS2:VOLT:RANG:UPP?", "10"},
		{"SENS2:VOLT:RANG:LOW 0", "SENS2:VOLT:RANG:LOW?", "0"},
		{"INP1:ATT 1", "INP1:ATT?", "1"},
		{"INP2:ATT 10", "INP2:ATT?", "10"},
		{"INP1:COUP AC", "INP1:COUP?", "AC"},
		{"INP2:COUP GND", "INP2:COUP?", "GND"},
		{"SENS:SWE:TIME 0.1", "SENS:SWE:TIME?", "100"},
	} {
		inBubble(t, knob.turned, func(t *testing.T) {
			f := drivertest.NewScope()
			s := openScope(t, f)
			must(t, second(s.Configure(t.Context(), twoChannels())))
			for range 3 {
				must(t, second(s.Capture(t.Context())))
			}
			must(t, s.conn.Write(t.Context(), knob.turned))
			_, err := s.Capture(t.Context())
			if err == nil {
				_, err = s.Capture(t.Context())
			}
			wants(t, err, ErrSettingsLost, "scope", knob.asked, knob.found, "configure it again")
			_, err = s.Capture(t.Context())
			wants(t, err, ErrNotConfigured)
		})
	}
}

// After an exchange that failed nothing is left to a later turn.
func TestAllChannelsAreReadBackAfterAFailure(t *testing.T) {
	inBubble(t, "", func(t *testing.T) {
		f := drivertest.NewScope()
		s := openScope(t, f)
		must(t, second(s.Configure(t.Context(), twoChannels())))
		before := f.Count("INP1:ATT?") + f.Count("INP2:ATT?")
		must(t, second(s.Capture(t.Context())))
		if n := f.Count("INP1:ATT?") + f.Count("INP2:ATT?") - before; n != 1 {
			t.Errorf("%d channels were read back before a record, want one", n)
		}
		s.shaken.Store(true)
		must(t, second(s.Capture(t.Context())))
		if n := f.Count("INP1:ATT?") + f.Count("INP2:ATT?") - before; n != 3 {
			t.Errorf("%d channels were read back in all, want one and then both", n)
		}
	})
}

// A setting that moves another is found before anything is measured with it.
func TestSettingThatMovesAnother(t *testing.T) {
	inBubble(t, "", func(t *testing.T) {
		f := drivertest.NewScope()
		s := openScope(t, f)
		asked := 0
		f.Fate = func(m string) drivertest.Fate {
			if m == "SENS1:VOLT:RANG:LOW?" {
				if asked++; asked > 1 {
					return drivertest.Fate{Reply: "-4\n"}
				}
			}
			return drivertest.Fate{}
		}
		_, err := s.Configure(t.Context(), twoChannels())
		wants(t, err, ErrSettingsLost, "after all was set", "SENS1:VOLT:RANG:LOW?", "−4")
	})
}

// On scopes of steps the offset is held to the height of the screen, whichever way it is
// said, since the middle may be 0 V.
func TestTurnedOffsetIsFound(t *testing.T) {
	for _, c := range []struct {
		dialect, turned string
		make            func() *drivertest.MakerScope
	}{
		{"keysight-infiniivision", ":CHAN1:OFFS 1", drivertest.InfiniiVision},
		{"rigol-ds1000z", ":CHAN1:OFFS 1", drivertest.DS1054Z},
		{"siglent-sds1000xe", "C1:OFST 1", drivertest.SDS1104XE},
		{"tektronix-tds2000", "CH1:POS 2", drivertest.TDS2024B},
	} {
		inBubble(t, c.dialect, func(t *testing.T) {
			s := openMakerScope(t, c.make(), c.dialect)
			want := screens(1)
			want.Channels = want.Channels[:1]
			must(t, second(s.Configure(t.Context(), want)))
			must(t, second(s.Capture(t.Context())))
			must(t, s.conn.Write(t.Context(), c.turned))
			_, err := s.Capture(t.Context())
			wants(t, err, ErrSettingsLost, "configure it again")
		})
	}
}
