package runner_test

import (
	"context"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// held begins a night and holds it after its first point.
func (n *night) held() <-chan runner.Outcome {
	done := n.begin()
	n.measured(1)
	n.must(n.run.Command(runner.CmdHold, "Ada"))
	n.until("held", func() bool { return n.run.State() == sweeps.HeldState })
	return done
}

// Somebody turns the supply's current limit while the run is held: continue tells it anew.
func TestContinueSetsTheLimitAnew(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		done := n.held()
		heard := len(n.supplyLog())
		n.must(n.options.Bench.Supply.SetCurrentLimit(n.Context(), si.Amperes(0.011)))
		n.must(n.run.Command(runner.CmdContinue, "Ada"))
		n.safe(<-done, sweeps.Done, "")
		told := ""
		for _, l := range n.supplyLog()[heard:] {
			if strings.HasPrefix(l.Heard, "CURR ") {
				told = l.Heard
			}
			if l.Output != nil && *l.Output {
				break
			}
		}
		if told == "" || told == "CURR 0.011" {
			t.Errorf("before the output went on again the last limit told was %q", told)
		}
	})
}

// Somebody switches the output on while the run is held: that is seen, and ends in off.
func TestOutputOnWhileHeldIsATrip(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		done := n.held()
		n.must(n.options.Bench.Supply.SetOutput(n.Context(), true))
		n.safe(<-done, sweeps.Tripped, "went on while the run was held")
	})
}

// A cutoff is not fed from the moment a hold makes safe until the run goes on.
func TestCutoffIsNotFedWhileHeld(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		c := &contact{}
		n.options.Bench.Cutoff = c
		done := n.held()
		time.Sleep(time.Minute)
		if _, opens, after := c.seen(); opens == 0 || after != 0 {
			t.Errorf("opened %d times, fed %d times after that while held", opens, after)
		}
		n.must(n.run.Command(runner.CmdContinue, "Ada"))
		<-done
		if _, _, after := c.seen(); after == 0 {
			t.Error("the run went on without feeding the cutoff")
		}
	})
}

// A disk that hangs heeds no context: the run ends failed, and the output is off.
func TestJournalThatHeedsNoContextEndsTheRun(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		free := make(chan struct{})
		var hangs atomic.Bool
		n.options.Journal = journal(func(ctx context.Context, e sweeps.Entry) (sweeps.Entry, error) {
			if e.Kind == sweeps.KindPoint && e.Point.Setpoint.Index == 1 || hangs.Load() {
				hangs.Store(true)
				<-free
			}
			return n.store.Append(context.WithoutCancel(ctx), e)
		})
		done := n.begin()
		n.until("off", func() bool { return hangs.Load() && n.run.Vitals().Energised == sweeps.EnergisedNo })
		end := <-done
		close(free)
		if end.State != sweeps.Failed || !strings.Contains(end.Reason, "no answer within") || !end.Off.Confirmed {
			t.Errorf("ended %+v", end)
		}
		time.Sleep(time.Minute) // the writers left behind come back
	})
}

// bare is a supply that can't be told an over-voltage level.
type bare struct{ instruments.Supply }

func (bare) Protect(context.Context, si.Voltage) error { return instruments.ErrCannot }

// A supply without an over-voltage level of its own is used only where somebody attends, and that is said.
func TestSupplyWithoutProtectionNeedsSomebody(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		n.options.Bench.Supply = bare{n.options.Bench.Supply}
		end := n.conduct()
		if end.State != sweeps.Failed || !strings.Contains(end.Reason, "attended =") {
			t.Errorf("ended %+v", end)
		}
		if _, times := n.output(); times != 0 {
			t.Errorf("the output was on %d times", times)
		}
	})
	inNight(t, short(""), func(n *night) {
		n.options.Bench.Supply = bare{n.options.Bench.Supply}
		n.options.Plan.Attended = "Ada until 18:00"
		n.safe(n.conduct(), sweeps.Done, "")
		if !n.said(sweeps.KindLog, "has to be set at its front panel") {
			t.Error("the log does not say that the level is missing")
		}
	})
}
