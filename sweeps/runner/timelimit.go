package runner

import (
	"context"
	"fmt"
	"time"

	"nightbench/sweeps"
)

// safeMargin of wall time is kept for making safe before a plan's limit.
const safeMargin = 30 * time.Second

// endInTime ends the run so that the bench is safe by the plan's limit. Held or not, the limit counts.
func (r *Runner) endInTime(ctx context.Context) {
	left, why := r.timeLimit()
	if left == 0 {
		return
	}
	by := r.o.Clock.Now().Add(left)
	r.tell(func(v *sweeps.Vitals) { v.SafeBy = &by })
	if r.o.Clock.Wait(ctx, left-min(safeMargin, left/10)) == nil {
		r.cancel(&Stop{Reason: why})
	}
}

// timeLimit is the wall time the plan leaves, and the reason it will give; 0 is no limit.
func (r *Runner) timeLimit() (left time.Duration, why string) {
	p := r.o.Plan
	if p.AtMost > 0 {
		left = r.wall(p.AtMost)
		why = fmt.Sprintf("the plan's limit of %s was reached", p.AtMost)
	}
	if !r.o.SafeBy.IsZero() {
		if d := r.o.SafeBy.Sub(r.o.Clock.Now()); left == 0 || d < left {
			left, why = max(d, time.Millisecond), "the time to be safe by, "+r.o.SafeBy.Local().Format("15:04")+", was reached"
		}
	}
	return left, why
}

// wall is how long a span of bench time lasts on the wall.
func (r *Runner) wall(bench time.Duration) time.Duration {
	return time.Duration(float64(bench) / r.o.Clock.Pace())
}
