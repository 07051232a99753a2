package runner_test

import (
	"context"
	"strings"
	"testing"
	"time"

	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// Hold: the reading in hand is finished, the output goes off, confirmed, within
// seconds, at every stage of a point; continue re-energises and nothing is measured twice.
func TestHoldAndContinue(t *testing.T) {
	for _, doing := range []string{"Warming up", "Settling", "Measuring"} {
		t.Run(doing, func(t *testing.T) {
			plan := short("[warm_up]\nat = { supply_voltage = \"12 V\", pot_resistance = \"10k\" }\nfor = \"1 min\"\n" + trips)
			inNight(t, plan, func(n *night) {
				done := n.begin()
				n.until(doing, func() bool { return strings.HasPrefix(n.run.Vitals().Doing, doing) })
				asked, kept := n.clock.Elapsed(), n.run.Vitals().Measured
				n.must(n.run.Command(runner.CmdHold, "Ada"))
				n.until("held", func() bool { return n.run.State() == sweeps.HeldState })
				if took := n.clock.Elapsed() - asked; took > 5*time.Second {
					t.Errorf("held only after %s", took)
				}
				if on, _ := n.output(); on || n.mark.isSet() || n.run.Vitals().Energised != sweeps.EnergisedNo {
					t.Error("held, and not off")
				}
				if got := len(n.points()); got > kept+1 {
					t.Errorf("%d points were measured between the hold and off", got-kept)
				}
				time.Sleep(time.Minute)
				if n.run.State() != sweeps.HeldState {
					t.Fatalf("it went on by itself: %s", n.run.State())
				}
				n.must(n.run.Command(runner.CmdContinue, "Ada"))
				n.safe(<-done, sweeps.Done, "")
				if _, times := n.output(); times != 2 || len(n.points()) != len(n.options.Order) {
					t.Errorf("switched on %d times, %d points", times, len(n.points()))
				}
				if len(n.mark.early) > 0 {
					t.Error(n.mark.early)
				}
			})
		})
	}
}

// After a hold the next setpoint is reached from the one measured last: same side, same hysteresis.
func TestHoldReturnsFromTheSameSide(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		done := n.begin()
		n.measured(2)
		n.must(n.run.Command(runner.CmdHold, "Ada"))
		n.until("held", func() bool { return n.run.State() == sweeps.HeldState })
		last := n.points()[len(n.points())-1].Setpoint
		before := len(n.entries())
		n.must(n.run.Command(runner.CmdContinue, "Ada"))
		n.safe(<-done, sweeps.Done, "")
		for _, e := range n.entries()[before:] {
			if e.Kind == sweeps.KindEnergising && !strings.Contains(e.Words, runner.Place(last)) {
				t.Errorf("re-energised with %q, the last point was at %s", e.Words, runner.Place(last))
			}
		}
	})
}

func TestStopWhileHeld(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		done := n.begin()
		n.measured(1)
		n.must(n.run.Command(runner.CmdHold, "Ada"))
		n.until("held", func() bool { return n.run.State() == sweeps.HeldState })
		if err := n.run.Command(runner.CmdHold, "Ada"); err == nil {
			t.Error("held twice")
		}
		n.must(n.run.Command(runner.CmdStop, "Ada"))
		end := <-done
		n.safe(end, sweeps.Stopped, "stopped by Ada")
		n.journaled(end)
	})
}

// A plan's limit counts while a run is held.
func TestTimeLimitWhileHeld(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		n.options.Plan.AtMost = 10 * time.Minute
		done := n.begin()
		n.measured(1)
		n.must(n.run.Command(runner.CmdHold, "Ada"))
		n.safe(<-done, sweeps.Stopped, "limit of 10m0s")
		if n.clock.Elapsed() > 10*time.Minute {
			t.Errorf("safe only after %s", n.clock.Elapsed())
		}
	})
}

// Off that can't be confirmed is tried again, loudly, and the run stays in making_safe until it is.
func TestUnconfirmedOffIsRetried(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		done := n.begin()
		n.measured(2)
		n.cables["supply"].pull()
		for range 3 {
			time.Sleep(time.Minute)
			if v := n.run.Vitals(); n.run.State() != sweeps.MakingSafe || v.Energised != sweeps.EnergisedUnconfirmed ||
				!strings.Contains(v.Doing, "NOT CONFIRMED") || !strings.Contains(v.Detail, "by hand") {
				t.Fatalf("%s, %+v", n.run.State(), v)
			}
			if !n.mark.isSet() {
				t.Fatal("the energised record is gone, and off was never confirmed")
			}
		}
		if err := n.run.Command(runner.CmdContinue, "Ada"); err == nil {
			t.Error("it may go on")
		}
		if loud := strings.Count(n.log.String(), "OFF IS NOT CONFIRMED"); loud < 5 {
			t.Errorf("said %d times in three minutes", loud)
		}
		n.cables["supply"].plug()
		end := <-done
		n.safe(end, sweeps.Tripped, "blind")
		n.journaled(end)
		if !n.said(sweeps.KindOff, "NOT CONFIRMED OFF") || !n.said(sweeps.KindOff, "Output off, confirmed") {
			t.Error("the journal does not tell both")
		}
	})
}

// When nobody will wait any longer the run ends unconfirmed, says so, and keeps the energised record.
func TestGivenUpUnconfirmed(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		done := n.begin()
		n.measured(1)
		n.cables["supply"].pull()
		time.Sleep(2 * time.Minute)
		n.giveUp()
		end := <-done
		if end.Off.Confirmed || end.State != sweeps.Tripped || !n.mark.isSet() || n.run.Vitals().Energised != sweeps.EnergisedUnconfirmed {
			t.Errorf("%+v, record kept: %v, %s", end, n.mark.isSet(), n.run.Vitals().Energised)
		}
	})
}

// A driver that panics when switching off is only a step that failed.
func TestPanicWhileMakingSafe(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		bad := &supply{Supply: n.options.Bench.Supply}
		bad.off = func(context.Context) error { panic("torn") }
		n.options.Bench.Supply = bad
		done := n.begin()
		n.measured(1)
		n.must(n.run.Command(runner.CmdStop, "Ada"))
		n.safe(<-done, sweeps.Stopped, "")
	})
}

// A journal that hangs, and a conductor that does not come back, hold nothing up: off is at once.
func TestNothingHoldsUpOff(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		n.options.Journal = journal(func(ctx context.Context, e sweeps.Entry) (sweeps.Entry, error) {
			if e.State == sweeps.MakingSafe {
				<-ctx.Done()
				return e, ctx.Err()
			}
			return n.store.Append(ctx, e)
		})
		endless := stuck{n.options.Predict, n, make(chan struct{})}
		n.options.Predict = endless
		done := n.begin()
		n.measured(2)
		time.Sleep(time.Minute)
		asked := n.clock.Elapsed()
		n.must(n.run.Command(runner.CmdStop, "Ada"))
		n.until("off", func() bool { on, _ := n.output(); return !on })
		if took := n.clock.Elapsed() - asked; took > 100*time.Millisecond {
			t.Errorf("off after %s", took)
		}
		n.until("confirmed", func() bool { return n.run.Vitals().Energised == sweeps.EnergisedNo })
		close(endless.free)
		n.safe(<-done, sweeps.Stopped, "stopped by Ada")
		if !strings.Contains(n.log.String(), "could not be written") {
			t.Error("nobody heard of the journal")
		}
	})
}

// stuck never comes back from the prediction of the third point, whatever its context.
type stuck struct {
	runner.Predictor
	n    *night
	free chan struct{}
}

func (s stuck) At(supply, pot float64) (map[sweeps.Quantity]sweeps.Prediction, []sweeps.Flag) {
	if s.n.run.Vitals().Measured >= 2 {
		<-s.free
	}
	return s.Predictor.At(supply, pot)
}
