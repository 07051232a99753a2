package runner_test

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"
	"time"

	"nightbench/sweeps"
	"nightbench/sweeps/runner"
	"nightbench/sweeps/schedule"
)

func TestSampleNight(t *testing.T) {
	inNight(t, samplePlan, func(n *night) {
		end := n.conduct()
		n.safe(end, sweeps.Done, "all setpoints measured")
		n.journaled(end)
		if got, want := len(n.points()), len(n.options.Order); got != want || got != 32 {
			t.Errorf("%d points of %d", got, want)
		}
		for i, p := range n.points() {
			if p.Setpoint != n.options.Order[i] {
				t.Errorf("point %d is of setpoint %+v", i, p.Setpoint)
			}
		}
		if _, times := n.output(); times != 1 {
			t.Errorf("the output went on %d times", times)
		}
		if n.clock.Elapsed() > 6*time.Minute {
			t.Errorf("it took %s of bench time", n.clock.Elapsed())
		}
	})
}

// The whole way on the true timer: what is measured is what is there.
func TestMeasuresTheBoard(t *testing.T) {
	plan := strings.NewReplacer(`direction = "both"`, `direction = "up"`, `"9 V", `, ``, `"10k", `, ``).Replace(short(""))
	onBoard(t, pump(), plan, func(n *night) {
		n.safe(n.conduct(), sweeps.Done, "")
		for _, p := range n.points() {
			if p.Flagged() {
				t.Errorf("%s: flagged %+v", p.Setpoint.Direction, p)
			}
			f, _ := p.Reading(sweeps.Frequency)
			band := p.Predictions[sweeps.Frequency]
			if *f.Value < band.Low || *f.Value > band.High { // every part is at its nominal value
				t.Errorf("%g V, %g ohm: frequency %g Hz, predicted %g to %g Hz", p.Setpoint.Supply, p.Setpoint.Pot, *f.Value, band.Low, band.High)
			}
			v, _ := p.Reading(sweeps.AverageVoltage)
			if want := p.Predictions[sweeps.AverageVoltage]; math.Abs(*v.Value-want.Value) > 0.05*want.Value {
				t.Errorf("%g V, %g ohm: average %g V, predicted %g V", p.Setpoint.Supply, p.Setpoint.Pot, *v.Value, want.Value)
			}
		}
	})
}

// Sped up, the plan's times are bench time; links, blind time and stamps stay wall time.
func TestPaced(t *testing.T) {
	atPace(t, 20, light(), short(trips), func(n *night) {
		n.safe(n.conduct(), sweeps.Done, "")
		if len(n.points()) != len(n.options.Order) {
			t.Errorf("%d points", len(n.points()))
		}
	})
	atPace(t, 20, light(), short(trips), func(n *night) {
		n.options.Plan.AtMost = 20 * time.Second
		began := n.clock.Now()
		n.safe(n.conduct(), sweeps.Stopped, "limit of 20s")
		if took := n.clock.Now().Sub(began); took > 1200*time.Millisecond {
			t.Errorf("20 s at pace 20 took %s of wall time", took)
		}
	})
	atPace(t, 20, light(), short(""), func(n *night) {
		done := n.begin()
		n.measured(1)
		n.cables["supply"].mute.Store(true)
		began := n.clock.Now()
		n.later(10*time.Second, func() { n.cables["supply"].mute.Store(false) })
		n.until("made safe", func() bool { return n.run.State() == sweeps.MakingSafe })
		if took := n.clock.Now().Sub(began); took < 1400*time.Millisecond || took > 2100*time.Millisecond {
			t.Errorf("blind after %s of wall time; it is never paced", took)
		}
		n.safe(<-done, sweeps.Tripped, "blind")
	})
}

// "About to energise" is durable in the journal and in the file before the output
// goes on, and the limits were set and read back before that. The order is the supply's own log's.
func TestEnergiseOrder(t *testing.T) {
	inNight(t, short(trips), func(n *night) {
		n.safe(n.conduct(), sweeps.Done, "")
		if len(n.mark.early) > 0 {
			t.Error(n.mark.early)
		}
		at := map[string]int{}
		for i, l := range n.supplyLog() {
			for _, what := range []string{"VOLT:PROT ", "VOLT:PROT?", "CURR ", "CURR?", "VOLT 9", "OUTP ON"} {
				if strings.HasPrefix(l.Heard, what) && at[what] == 0 {
					at[what] = i + 1
				}
			}
		}
		for _, what := range []string{"VOLT:PROT ", "VOLT:PROT?", "CURR ", "CURR?", "VOLT 9"} {
			if at[what] == 0 || at[what] > at["OUTP ON"] {
				t.Errorf("%q came at line %d of the supply's log, OUTP ON at %d", what, at[what], at["OUTP ON"])
			}
		}
	})
}

// The limit of the supply itself follows the setpoint: 1.3 × what a locked rotor and
// the board take there, never above the bench's 1 A (bench.toml).
func TestCurrentLimitFollowsTheSetpoint(t *testing.T) {
	plan := strings.Replace(short(""), `"9 V"`, `"7 V"`, 1)
	inNight(t, plan, func(n *night) {
		n.safe(n.conduct(), sweeps.Done, "")
		set := map[string]bool{}
		for _, l := range n.supplyLog() {
			if v, ok := strings.CutPrefix(l.Heard, "CURR "); ok {
				set[v] = true
			}
		}
		if !set["1"] {
			t.Errorf("limits set: %v; at 12 V a locked rotor could draw 1.08 A, so the bench's own limit counts", set)
		}
		if len(set) < 2 {
			t.Errorf("limits set: %v; none of its own at 7 V", set)
		}
	})
}

func TestNothingLeftToMeasure(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		for _, s := range n.options.Order {
			n.options.Done = append(n.options.Done, sweeps.Point{Setpoint: s})
		}
		end := n.conduct()
		if end.State != sweeps.Done || !end.Off.Confirmed {
			t.Errorf("%+v", end)
		}
		if _, times := n.output(); times != 0 {
			t.Error("the output went on for nothing")
		}
	})
}

// A run that was stopped goes on where it was; it returns from the point measured last.
func TestResume(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		end := n.begin()
		n.measured(4)
		n.must(n.run.Command("stop", "Ada"))
		n.safe(<-end, sweeps.Stopped, "stopped by Ada")
		kept := n.points()
		if len(kept) < 4 {
			t.Fatalf("%d points are kept", len(kept))
		}
		first, _ := n.store.Append(context.Background(), sweeps.Entry{Run: n.options.Run.ID, Kind: sweeps.KindState, State: sweeps.Preparing})
		n.options.Done, n.options.Before = kept, time.Hour
		n.safe(n.conduct(), sweeps.Done, "")
		n.once()
		if p := n.points()[len(kept)]; p.Elapsed < 3600 || p.Elapsed > 3600+120 {
			t.Errorf("resumed an hour into the run, the next point is %.1f s into it", p.Elapsed)
		}
		if got := len(n.points()); got != len(n.options.Order) {
			t.Errorf("%d points of %d", got, len(n.options.Order))
		}
		for _, e := range n.entries() {
			if e.Seq > first.Seq && e.Elapsed < 3600 {
				t.Errorf("%s %q is %.1f s into a run resumed after an hour", e.Kind, e.Words, e.Elapsed)
			}
			if e.Seq > first.Seq && e.Kind == sweeps.KindEnergising {
				if from := runner.Place(kept[len(kept)-1].Setpoint); !strings.Contains(e.Words, from) {
					t.Errorf("energised at %q, not where it was", e.Words)
				}
			}
		}
		if _, more := schedule.Next(n.options.Order, n.points()); more {
			t.Error("something is left")
		}
	})
}

func TestWarmUpComesFirst(t *testing.T) {
	inNight(t, short("[warm_up]\nat = { supply_voltage = \"12 V\", pot_resistance = \"10k\" }\nfor = \"1 min\"\n"), func(n *night) {
		n.safe(n.conduct(), sweeps.Done, "")
		if !n.said(sweeps.KindLog, "Warm-up 1m0s at 12\u00a0V") || !n.said(sweeps.KindEnergising, "12\u00a0V") {
			t.Error("the log does not tell the warm-up")
		}
		if first := n.points()[0]; first.Elapsed < 60 || first.Setpoint.Supply != 9 {
			t.Errorf("the first point came after %.0f s, at %g V", first.Elapsed, first.Setpoint.Supply)
		}
	})
}

// A supply goes down only as fast as its load empties it: the point after waits for it.
func TestDownwardStepWaitsForTheSupply(t *testing.T) {
	b := light()
	b.Source.Bulk, b.Driver.Resistance, b.Load.Resistance = 20e-3, 0.05, 400 // 20 mF through some hundred ohms: seconds
	plan := strings.NewReplacer(`values = ["9 V", "12 V"]`, `values = ["9 V", "12 V"]`+"\n"+`direction = "down"`, `"4.7k", "10k", "22k"`, `"10k"`).Replace(short(""))
	onBoard(t, b, plan, func(n *night) {
		n.safe(n.conduct(), sweeps.Done, "")
		var down time.Duration
		var at time.Time
		for _, e := range n.entries() {
			if strings.HasPrefix(e.Words, "Supply to 9\u00a0V") {
				at = e.At
			}
		}
		for _, p := range n.points() {
			if p.Setpoint.Supply == 9 {
				down = p.At.Sub(at)
				break
			}
		}
		if down < 3*time.Second {
			t.Errorf("the first point at 9 V came %s after the step down", down)
		}
	})
}

// A setpoint that keeps moving is measured all the same, and says so.
func TestUnsettledIsFlagged(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		n.options.Order = n.options.Order[:1]
		drifting := meter{Meter: n.options.Bench.Meters[0]}
		drifting.read = func(ctx context.Context) (s sample, err error) {
			s, err = drifting.Meter.Read(ctx)
			s.Value *= 1 + n.clock.Elapsed().Seconds()/30
			return s, err
		}
		n.options.Bench.Meters[0] = &drifting
		n.safe(n.conduct(), sweeps.Done, "")
		p := n.points()[0]
		v, _ := p.Reading(sweeps.AverageVoltage)
		if !flagged(v, "unsettled") || p.Elapsed < 20 || p.Elapsed > 60 {
			t.Errorf("after %.0f s: %+v", p.Elapsed, v)
		}
	})
}

// A meter that says nothing but overload must not hold the run up for ever.
func TestSettlingOnOverloadEnds(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		n.options.Order = n.options.Order[:1]
		over := meter{Meter: n.options.Bench.Meters[0]}
		over.read = func(ctx context.Context) (s sample, err error) {
			s, err = over.Meter.Read(ctx)
			s.Value, s.Outcome, s.Raw = math.NaN(), "overload", "9.90000000E+37"
			return s, err
		}
		n.options.Bench.Meters[0] = &over
		end := n.conduct()
		if end.State != sweeps.Done {
			t.Fatalf("%+v", end)
		}
		v, _ := n.points()[0].Reading(sweeps.AverageVoltage)
		if !flagged(v, "overload") && !flagged(v, "unsettled") {
			t.Errorf("%+v", v)
		}
	})
}

// One failed reading is tried once more, and written down.
func TestOneFailedReadingIsMended(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		n.options.Order = n.options.Order[:2]
		bad, reads := meter{Meter: n.options.Bench.Meters[1]}, 0
		bad.read = func(ctx context.Context) (sample, error) {
			if reads++; reads == 2 {
				return sample{}, errors.New("meter motor: framing")
			}
			return bad.Meter.Read(ctx)
		}
		n.options.Bench.Meters[1] = &bad
		n.safe(n.conduct(), sweeps.Done, "")
		if !n.said(sweeps.KindLog, "meter motor: framing. The second try went well.") {
			t.Error("nothing in the log")
		}
	})
}
