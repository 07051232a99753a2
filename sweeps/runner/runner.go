// Package runner conducts a run: set, settle, measure, derive, check, append,
// next. One goroutine conducts, one watches the supply, one notices when nobody
// sees it any more. Whatever happens, there is one way to safe: the run's
// context is cancelled with a cause, and at once, whether or not the conductor
// comes back, the bench is made safe in a context of its own.
package runner

import (
	"context"
	"log/slog"
	"sync"
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// Journal is where a run writes. Append is durable when it returns.
type Journal interface {
	Append(ctx context.Context, e sweeps.Entry) (sweeps.Entry, error)
}

// Mark is the tiny durable record, outside the journal, that the bench is about
// to be energised. It is set before the output goes on and cleared only when off is confirmed.
type Mark interface {
	Set(run int64) error
	Clear() error
}

// Predictor gives what the schematic predicts at a point: at the measured supply
// voltage (V) and the actual pot resistance (Ω).
type Predictor interface {
	At(supply, pot float64) (map[sweeps.Quantity]sweeps.Prediction, []sweeps.Flag)
	Curves(order []sweeps.Setpoint) []sweeps.Curve
	// Tau is the largest time constant of the board, s: the motor's.
	Tau() float64
	// Peak is the largest current the load can draw at a supply voltage, A: a locked rotor's.
	Peak(supply float64) float64
}

// Options are what a run needs. All fields but Done, Before and Changed are required.
type Options struct {
	Bench   instruments.Bench
	Clock   instruments.Clock
	Journal Journal
	Mark    Mark
	Predict Predictor
	Board   sweeps.Board
	Plan    sweeps.Plan
	Run     sweeps.Run
	Order   []sweeps.Setpoint
	Done    []sweeps.Point       // measured before, on a resumed run
	Before  time.Duration        // bench time since the run began, on a resumed run: as far as its journal tells
	SafeBy  time.Time            // wall time the plan must be safe by; zero: none
	Safe    instruments.SafeSpec // what safe means on this bench
	Changed func()               // rung when the vitals changed in a way worth showing at once
	Log     *slog.Logger
}

// Runner is one run, from preparing to its end. Use it once.
type Runner struct {
	o      Options
	order  []sweeps.Setpoint
	begun  time.Duration // bench time at which the run began, had it not been interrupted
	limits *limits
	strain strain
	hold   chan struct{} // one slot: a person asked for a hold
	goOn   chan struct{} // one slot: a person asked to continue
	offing chan struct{} // one slot: full while nobody makes the bench safe

	life   context.Context // ends with the cause that ends the run
	cancel context.CancelCauseFunc

	// The conductor's own.
	points  []sweeps.Point
	limit   float64 // A, current limit in force
	takes   takes   // of one reading, in force
	predict memo

	mu     sync.Mutex // guards what follows; never held over I/O
	state  sweeps.State
	vitals sweeps.Vitals
	drive  drive
	fed    bool // the cutoff is to be kept closed
}

// New makes a run ready to be conducted.
func New(o Options) *Runner {
	r := &Runner{
		o: o, order: o.Order, points: append([]sweeps.Point(nil), o.Done...),
		limits: newLimits(o.Plan.Trips), state: sweeps.Preparing,
		hold: make(chan struct{}, 1), goOn: make(chan struct{}, 1), offing: make(chan struct{}, 1),
	}
	r.life, r.cancel = context.WithCancelCause(context.Background())
	r.offing <- struct{}{}
	r.vitals = sweeps.Vitals{
		Energised: sweeps.EnergisedNo, Run: o.Run.ID, State: sweeps.Preparing, Doing: "Preparing",
		Planned: len(o.Order), Measured: len(o.Done), Flagged: countFlagged(o.Done), Repeats: o.Plan.Measure.Repeats,
	}
	return r
}

// Outcome is how a run ended.
type Outcome struct {
	State  sweeps.State
	Reason string
	Off    sweeps.Off
}

// Conduct carries the run out and returns when the bench is safe, or when last
// ends with off unconfirmed. ctx ends the run (its cause is the reason); last
// bounds only the making safe, which otherwise goes on until off is confirmed.
func (r *Runner) Conduct(ctx, last context.Context) Outcome {
	if ctx.Err() != nil {
		r.cancel(context.Cause(ctx))
	}
	untie := context.AfterFunc(ctx, func() { r.cancel(context.Cause(ctx)) })
	defer untie()
	r.begun = r.o.Clock.Elapsed() - r.o.Before
	g := crew{cancel: r.cancel}
	g.Go("watch", func() { r.watch(r.life) })
	g.Go("cutoff", func() { r.keepClosed(r.life) })
	g.Go("blind", func() { r.guardBlind(r.life) })
	g.Go("time limit", func() { r.endInTime(r.life) })
	g.Go("conductor", func() { r.cancel(r.meaning(r.conduct(r.life))) })
	<-r.life.Done()
	cause := context.Cause(r.life)
	r.logPanic(cause)
	end, pen := ending(cause), r.newPen(&g)
	r.enter(sweeps.MakingSafe)
	r.doing("Making the bench safe", end.Reason)
	pen.note(end, cause)
	off := r.makeSafe(last, pen)
	close(pen.entries)
	g.wait(last)
	return r.close(r.secondThought(last, end), off)
}

// close writes the run's last entry.
func (r *Runner) close(end Outcome, off sweeps.Off) Outcome {
	end.Off = off
	if _, err := r.append(sweeps.Entry{Kind: sweeps.KindEnded, State: end.State, Words: end.Reason}); err != nil {
		r.o.Log.Error("the run's end could not be written", "run", r.o.Run.ID, "err", err)
	}
	r.enter(end.State)
	if off.Confirmed {
		r.doing("The run is over", end.Reason)
	}
	return end
}

func countFlagged(points []sweeps.Point) (n int) {
	for _, p := range points {
		if p.Flagged() {
			n++
		}
	}
	return n
}
