package runner

import (
	"context"
	"errors"
	"time"

	"nightbench/sweeps"
)

// journalBudget bounds one write; a disk that takes longer is as good as failed.
const journalBudget = 10 * time.Second

// errJournalStuck is the failure of a journal that gave no answer in time.
var errJournalStuck = errors.New("no answer within " + journalBudget.String() + ": is the disk failing, full or gone to sleep?")

// append writes to the journal in a bounded context of its own: the run's may be
// over. A panic in the journal is a journal that failed, and so is silence: a disk
// that hangs does not heed the context, and its writer is left behind.
func (r *Runner) append(e sweeps.Entry) (written sweeps.Entry, err error) {
	ctx, cancel := context.WithTimeout(context.Background(), journalBudget)
	defer cancel()
	type outcome struct {
		written sweeps.Entry
		err     error
	}
	done := make(chan outcome, 1)
	e = r.stamped(e)
	go func() {
		var o outcome
		o.err = guard("journal", func() (err error) {
			o.written, err = r.o.Journal.Append(ctx, e)
			return err
		})
		done <- o
	}()
	patience := time.NewTimer(journalBudget + time.Second) // a journal that heeds its context answers by itself
	defer patience.Stop()
	select {
	case o := <-done:
		return o.written, o.err
	case <-patience.C:
		return e, errJournalStuck
	}
}

// stamped gives an entry its run and instant, where it has none yet.
func (r *Runner) stamped(e sweeps.Entry) sweeps.Entry {
	if e.At.IsZero() {
		e.Run, e.At, e.Elapsed = r.o.Run.ID, r.o.Clock.Now(), (r.o.Clock.Elapsed() - r.begun).Seconds()
	}
	return e
}

// say writes a sentence to the log of the run. A journal that fails ends the run.
func (r *Runner) say(words string) {
	if _, err := r.append(sweeps.Entry{Kind: sweeps.KindLog, Words: words}); err != nil {
		r.cancel(&journalFailed{err})
	}
}

// pen writes a run's last words in order and in a goroutine of its own, so that
// a journal that is slow or stuck never holds up the making safe.
type pen struct {
	r       *Runner
	entries chan sweeps.Entry
}

func (r *Runner) newPen(g *crew) *pen {
	p := &pen{r: r, entries: make(chan sweeps.Entry, 8)} // state, reason, off unconfirmed, off: room to spare
	g.Go("last words", func() {
		for e := range p.entries {
			if _, err := r.append(e); err != nil {
				r.o.Log.Error("could not be written", "run", r.o.Run.ID, "words", e.Words, "err", err)
			}
		}
	})
	return p
}

func (p *pen) write(e sweeps.Entry) { p.entries <- p.r.stamped(e) }

// note writes why the bench is being made safe, with the raw reading where there is one.
func (p *pen) note(end Outcome, cause error) {
	p.write(sweeps.Entry{Kind: sweeps.KindState, State: sweeps.MakingSafe, Words: said[sweeps.MakingSafe]})
	switch end.State {
	case sweeps.Tripped, sweeps.Failed:
		p.write(sweeps.Entry{Kind: sweeps.KindTrip, Words: withRaw(end.Reason, cause)})
	}
}

// off writes how making safe went.
func (p *pen) off(off sweeps.Off) {
	p.write(sweeps.Entry{Kind: sweeps.KindOff, Words: off.Words, Off: &off})
}
