package driver

import (
	"context"
	"math"
	"slices"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
)

func openScope(t *testing.T, f *drivertest.Scope) *Scope {
	t.Helper()
	conn, d := connect(t, &f.Listener, dialect.RoleScope, "standard-scope")
	s, _, err := OpenScope(t.Context(), conn, d, options("scope"))
	must(t, err)
	return s
}

// twoChannels is a record of 20 ms of two channels.
func twoChannels() instruments.ScopeSettings {
	return instruments.ScopeSettings{
		Channels: []instruments.ScopeChannel{{Number: 1, Low: -1, High: 12, Probe: 10}, {Number: 2, Low: -5, High: 20, Probe: 1}},
		Points:   2000, Duration: 0.02,
		Trigger: instruments.ScopeTrigger{Channel: 1, Level: 4.5},
	}
}

// square is 9 V at 125 Hz with a duty of 0.3 on channel 1, and a steady 30 V, beyond its screen, on channel 2.
func square(channel int, t float64) float64 {
	if channel == 2 {
		return 30
	}
	if phase := t*125 - math.Floor(t*125); phase < 0.3 {
		return 9
	}
	return 0
}

func TestScopeConfigure(t *testing.T) {
	inBubble(t, "AnswersWhatIsInForce", func(t *testing.T) {
		f := drivertest.NewScope()
		s := openScope(t, f)
		got, err := s.Configure(t.Context(), twoChannels())
		must(t, err)
		want := twoChannels()
		if !slices.Equal(got.Channels, want.Channels) || got.Points != want.Points || got.Duration != want.Duration || got.Trigger != want.Trigger {
			t.Errorf("got %+v", got)
		}
		for m, times := range map[string]int{"INP1:COUP DC": 1, "INP1:COUP?": 2, "INP1:ATT 10": 1, "SENS2:VOLT:RANG:UPP 20": 1, "SENS2:VOLT:RANG:LOW?": 2, "TRIG:SOUR CH1": 1, "TRIG:SLOP POS": 1, "FORM:BORD?": 1} {
			if f.Count(m) != times { // a setting is read back at once, and all of them in the end
				t.Errorf("%s was sent %d times, want %d", m, f.Count(m), times)
			}
		}
	})
}

func TestScopeConfigureRefuses(t *testing.T) {
	for name, spoil := range map[string]func(*instruments.ScopeSettings){
		"NoChannel":          func(s *instruments.ScopeSettings) { s.Channels = nil },
		"NoHeight":           func(s *instruments.ScopeSettings) { s.Channels[0].High = -1 },
		"NotANumber":         func(s *instruments.ScopeSettings) { s.Channels[0].High = math.NaN() },
		"TriggerNotRecorded": func(s *instruments.ScopeSettings) { s.Trigger.Channel = 3 },
		"TooManyPoints":      func(s *instruments.ScopeSettings) { s.Points = 2_000_000 },
		"NoDuration":         func(s *instruments.ScopeSettings) { s.Duration = 0 },
	} {
		inBubble(t, name, func(t *testing.T) {
			f := drivertest.NewScope()
			s := openScope(t, f)
			before := len(f.Received())
			want := twoChannels()
			spoil(&want)
			_, err := s.Configure(t.Context(), want)
			wants(t, err, ErrRefused, "scope")
			if len(f.Received()) != before {
				t.Errorf("sent %v", f.Received()[before:])
			}
		})
	}
	inBubble(t, "AChannelItDoesNotHave", func(t *testing.T) {
		s := openScope(t, drivertest.NewScope())
		want := twoChannels()
		want.Channels[1].Number = 3
		_, err := s.Configure(t.Context(), want)
		wants(t, err, link.ErrTimeout, "INP3:COUP?", "-114")
	})
	inBubble(t, "ACouplingThatStaysAC", func(t *testing.T) {
		f := drivertest.NewScope()
		f.Fate = func(m string) drivertest.Fate { return drivertest.Fate{Drop: m == "INP1:COUP DC"} }
		s := openScope(t, f)
		_, err := s.Configure(t.Context(), twoChannels())
		wants(t, err, ErrRefused, "INP1:COUP DC", "AC")
	})
}

func TestScopeCapture(t *testing.T) {
	inBubble(t, "Triggered", func(t *testing.T) {
		f := drivertest.NewScope()
		f.Signal = square
		s := openScope(t, f)
		must(t, second(s.Configure(t.Context(), twoChannels())))
		waves, err := s.Capture(t.Context())
		must(t, err)
		if len(waves) != 2 {
			t.Fatalf("%d waves", len(waves))
		}
		w := waves[0]
		if !w.Triggered || w.Channel != 1 || len(w.Codes) != 2000 || w.Interval != 1e-5 || w.Start != -0.002 || w.FullScale != 13 {
			t.Errorf("channel %d, triggered %v, %d points, %g s apart from %g s, %g V high", w.Channel, w.Triggered, len(w.Codes), w.Interval, w.Start, w.FullScale)
		}
		high := 0
		for _, c := range w.Codes {
			v := float64(c)*w.VoltsPerCode + w.VoltsAtZero
			if math.Abs(v) > w.VoltsPerCode && math.Abs(v-9) > w.VoltsPerCode {
				t.Fatalf("%g V is neither level", v)
			}
			if v > 4.5 {
				high++
			}
			if c <= w.ClipLow || c >= w.ClipHigh {
				t.Fatal("clipped inside the screen")
			}
		}
		if duty := float64(high) / 2000; math.Abs(duty-0.3) > 0.06 { // 2.5 periods: 0.3 ± half a period's share
			t.Errorf("duty %g", duty)
		}
		if w.Accuracy.Reading != 0.02 || w.Accuracy.Range != 0.01 || w.Accuracy.Resolution != w.VoltsPerCode || math.Abs(w.TimeBase-30e-6) > 1e-12 {
			t.Errorf("accuracy %+v, time base %g", w.Accuracy, w.TimeBase)
		}
		if c := waves[1].Codes[0]; c != waves[1].ClipHigh {
			t.Errorf("30 V on a screen up to 20 V has the code %d", c)
		}
	})
	inBubble(t, "OneUntriggeredRecordWhereNoTriggerComes", func(t *testing.T) {
		f := drivertest.NewScope()
		f.Dead = true
		s := openScope(t, f)
		must(t, second(s.Configure(t.Context(), twoChannels())))
		for range 2 {
			began := time.Now()
			waves, err := s.Capture(t.Context())
			must(t, err)
			if waves[0].Triggered || waves[1].Triggered || waves[0].Start != 0 {
				t.Errorf("triggered %v, start %g s", waves[0].Triggered, waves[0].Start)
			}
			if took := time.Since(began); took > 4*time.Second {
				t.Errorf("took %v", took)
			}
		}
		if f.Count("ABOR") != 2 || f.Count("INIT") != 4 {
			t.Errorf("%d aborts, %d starts", f.Count("ABOR"), f.Count("INIT"))
		}
		f.Dead = false
		waves, err := s.Capture(t.Context())
		must(t, err)
		if !waves[0].Triggered {
			t.Error("the trigger was not put back")
		}
	})
	inBubble(t, "ACutBlockIsNotUsed", func(t *testing.T) {
		f := drivertest.NewScope()
		f.Mangled = true
		s := openScope(t, f)
		must(t, second(s.Configure(t.Context(), twoChannels())))
		_, err := s.Capture(t.Context())
		wants(t, err, ErrReply, "1999 samples", "2000 are announced")
	})
	inBubble(t, "BeforeConfigure", func(t *testing.T) {
		s := openScope(t, drivertest.NewScope())
		_, err := s.Capture(t.Context())
		wants(t, err, ErrNotConfigured)
	})
	inBubble(t, "WaitsNoLongerThanItsContext", func(t *testing.T) {
		f := drivertest.NewScope()
		f.Dead = true
		s := openScope(t, f)
		must(t, second(s.Configure(t.Context(), twoChannels())))
		ctx, cancel := context.WithTimeout(t.Context(), 200*time.Millisecond)
		defer cancel()
		if _, err := s.Capture(ctx); err == nil {
			t.Error("a record came of nothing")
		}
		f.AtOnce("ABOR")
	})
	inBubble(t, "AfterItWasSwitchedOffAndOn", func(t *testing.T) {
		f := drivertest.NewScope()
		s := openScope(t, f)
		must(t, second(s.Configure(t.Context(), twoChannels())))
		f.Unplug()
		f.PowerOn()
		_, err := s.Capture(t.Context())
		wants(t, err, link.ErrLost)
		_, err = s.Capture(t.Context())
		wants(t, err, ErrSettingsLost, "scope")
	})
}

func TestScalingOfAnotherShapeIsRefused(t *testing.T) {
	for name, reply := range map[string]string{
		"FieldMissing":    "2000,1E-5,0,0.05\n",
		"NoInterval":      "2000,0,0,0.05,5\n",
		"NoVolts":         "2000,1E-5,0,9.91E37,5\n",
		"PartOfAPoint":    "2000.5,1E-5,0,0.05,5\n",
		"AnotherLanguage": "2000;1,0E-5;0;0,05;5\n",
	} {
		inBubble(t, name, func(t *testing.T) {
			f := drivertest.NewScope()
			f.Fate = func(m string) drivertest.Fate {
				if m == "TRAC:PRE? CH1" {
					return drivertest.Fate{Reply: reply}
				}
				return drivertest.Fate{}
			}
			s := openScope(t, f)
			must(t, second(s.Configure(t.Context(), twoChannels())))
			if w, err := s.Capture(t.Context()); err == nil {
				t.Errorf("scaled by %q: %+v", reply, w[0].VoltsPerCode)
			}
		})
	}
}

func TestPolledCompletion(t *testing.T) {
	inBubble(t, "AsksUntilDone", func(t *testing.T) {
		f := drivertest.NewSupply()
		conn, d := connect(t, &f.Listener, dialect.RoleSupply, "standard-supply")
		own := *d
		own.Completion = &dialect.Completion{Style: "polled", Ask: "*OPC?", Until: []string{"1"}}
		i := newInstrument(conn, &own, options("supply"))
		must(t, conn.Resync(t.Context()))
		before, n := f.Count("*OPC?"), 0
		f.Fate = func(m string) drivertest.Fate {
			if m == "*OPC?" {
				if n++; n < 4 { // answers 0 while busy, as Rigol's manuals state (DS1000Z guide)
					return drivertest.Fate{Reply: "0\n"}
				}
			}
			return drivertest.Fate{}
		}
		must(t, i.done(t.Context()))
		if got := f.Count("*OPC?") - before; got != 4 {
			t.Errorf("asked %d times", got)
		}
	})
}
