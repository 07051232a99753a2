package app

import (
	"fmt"
	"regexp"
	"strings"
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// longestWatch is how long one line of the plan may say that somebody attends: beyond
// it the hour named has passed and the next one is tomorrow's. Common practice, no source.
const longestWatch = 16 * time.Hour

var untilHour = regexp.MustCompile(`\buntil (\d\d?:\d\d)\b`)

// attendance refuses a start that nobody attends on a bench without a second way to
// cut power: with the host dead or a cable out, a supply goes on driving. It refuses
// one, too, whose supply is switched off, read back or protected by lines that nobody
// checked against a manual: whether they work has to be seen first. Where somebody has
// to attend it gives until when; the run is over by then. Zero: nobody has to.
func attendance(plan sweeps.Plan, w instruments.Wiring, cutoff instruments.Cutoff, unproven []string, now time.Time) (until time.Time, err error) {
	var why string
	switch {
	case w.Practice:
		return until, nil
	case len(unproven) > 0:
		why = fmt.Sprintf("the supply's dialect has unchecked lines for %s, and whether they work was never seen", strings.Join(unproven, ", "))
	case cutoff == instruments.NoCutoff:
		why = "this bench has no cutoff, a second way to cut power"
	default:
		return until, nil
	}
	const attend = `so somebody has to attend: add to [plan] who and until when, like attended = "AK until 18:00"`
	hour := untilHour.FindStringSubmatch(plan.Attended)
	if hour == nil {
		return until, fmt.Errorf("%s: %s, %s", plan.Path, why, attend)
	}
	until, err = safeBy(hour[1], now)
	if err != nil {
		return until, fmt.Errorf("%s: attended = %q: %w", plan.Path, plan.Attended, err)
	}
	if until.Sub(now) > longestWatch {
		return until, fmt.Errorf("%s: attended = %q: %s has passed; %s, %s", plan.Path, plan.Attended, hour[1], why, attend)
	}
	return until, nil
}

// whoAttends is who attends, for the log.
func whoAttends(plan sweeps.Plan) string {
	if plan.Attended == "" {
		return ""
	}
	return " Attended: " + plan.Attended + "."
}
