package runner_test

import (
	"context"
	"errors"
	"sync"
	"testing"
	"time"

	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// contact is a cutoff that notes when it was fed and when it was opened.
type contact struct {
	mu    sync.Mutex
	feeds []time.Time
	opens int
	after int   // feedings opened for
	fails error // what feeding answers from now on
}

func (c *contact) Feed(context.Context) error {
	c.mu.Lock()
	defer c.mu.Unlock()
	if c.opens > 0 {
		c.after++
	}
	c.feeds = append(c.feeds, time.Now())
	return c.fails
}

func (c *contact) Open(context.Context) error {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.opens++
	return nil
}

func (c *contact) Every() time.Duration { return 750 * time.Millisecond }

func (c *contact) seen() (feeds []time.Time, opens, after int) {
	c.mu.Lock()
	defer c.mu.Unlock()
	return append([]time.Time(nil), c.feeds...), c.opens, c.after
}

func (c *contact) breakDown() {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.fails = errors.New("no answer from the relay")
}

// The cutoff is fed from before the output goes on to the end of the run, never later
// than it wants, and opened at the end; after that nobody feeds it.
func TestCutoffIsFedWhileTheRunLasts(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		c := &contact{}
		n.options.Bench.Cutoff = c
		done := n.begin()
		n.measured(2)
		first, _, _ := c.seen()
		n.must(n.run.Command(runner.CmdStop, "Ada"))
		n.safe(<-done, sweeps.Stopped, "stopped by Ada")
		time.Sleep(10 * time.Second)
		feeds, opens, after := c.seen()
		if opens == 0 || after != 0 || len(first) < 3 {
			t.Errorf("fed %d times by the second point, opened %d times, fed %d times after", len(first), opens, after)
		}
		for i := 1; i < len(feeds); i++ {
			if gap := feeds[i].Sub(feeds[i-1]); gap > 800*time.Millisecond {
				t.Errorf("feeding %d came %s after the one before", i, gap)
			}
		}
	})
}

func TestCutoffThatCannotBeFedEndsTheRun(t *testing.T) {
	inNight(t, short(""), func(n *night) {
		c := &contact{}
		n.options.Bench.Cutoff = c
		end := n.begin()
		n.measured(1)
		c.breakDown()
		n.safe(<-end, sweeps.Tripped, "the cutoff can't be fed: no answer from the relay")
	})
	t.Run("FromTheStart", func(t *testing.T) {
		inNight(t, short(""), func(n *night) {
			c := &contact{}
			c.breakDown()
			n.options.Bench.Cutoff = c
			end := n.conduct()
			if on, times := n.output(); on || times != 0 || end.State == sweeps.Done {
				t.Errorf("ended %s: %s; the output went on %d times", end.State, end.Reason, times)
			}
		})
	})
}
