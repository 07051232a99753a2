package main

import (
	"context"
	"errors"
	"fmt"
	"net/http"
	"os"
	"strconv"

	"nightbench/daemon/web"
	"nightbench/sweeps"

	"github.com/spf13/cobra"
)

// order is a command that asks the daemon of the state folder for something.
func (c *cli) order(use, short string, do func(ctx context.Context, d *client, by string, args []string) (string, error)) *cobra.Command {
	var by string
	cmd := &cobra.Command{Use: use, Short: short, Args: cobra.NoArgs}
	cmd.Flags().StringVar(&by, "by", os.Getenv("USER"), "who asks: initials, for the log")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		dir, err := c.dir()
		if err != nil {
			return err
		}
		words, err := do(cmd.Context(), newClient(dir), by, args)
		if err == nil {
			say(cmd, "%s", words)
		}
		return err
	}
	return cmd
}

func (c *cli) stop() *cobra.Command {
	return c.order("stop", "End the open run, if any, and make the bench safe", func(ctx context.Context, d *client, by string, _ []string) (string, error) {
		said := "stopped; "
		var no *refused
		switch err := d.do(ctx, http.MethodPost, "/api/stop", web.StopRequest{By: by}, nil); {
		case errors.As(err, &no) && no.status == http.StatusConflict:
			said = "" // no run is open: the outputs go off all the same
		case err != nil:
			return "", err
		}
		words, err := outputsOff(ctx, d, by)
		return said + words, err
	})
}

func (c *cli) off() *cobra.Command {
	return c.order("off", "Outputs off, with or without a run", func(ctx context.Context, d *client, by string, _ []string) (string, error) {
		return outputsOff(ctx, d, by)
	})
}

// outputsOff asks for off and says what was read back.
func outputsOff(ctx context.Context, d *client, by string) (string, error) {
	var off sweeps.Off
	if err := d.do(ctx, http.MethodPost, "/api/off", web.ByRequest{By: by}, &off); err != nil {
		return "", err
	}
	if !off.Confirmed {
		return "", fmt.Errorf("off is not confirmed: %s", off.Words)
	}
	return off.Words, nil
}

func (c *cli) hold() *cobra.Command {
	return c.order("hold", "Finish the reading in hand, output off; 'resume' goes on", func(ctx context.Context, d *client, by string, _ []string) (string, error) {
		return "the run is held after the reading in hand; 'nightbench resume' goes on", d.do(ctx, http.MethodPost, "/api/hold", web.ByRequest{By: by}, nil)
	})
}

func (c *cli) resume() *cobra.Command {
	var wait bool
	cmd := c.order("resume [RUN]", "Go on with a held run, or with an interrupted or stopped one", nil)
	cmd.Long = "Without RUN: a held run goes on; where none is open, the newest run is resumed unless it is done. An older one has to be named.\nResuming energises the bench again: be there.\n\n" + cautions
	cmd.Args = cobra.MaximumNArgs(1)
	cmd.Flags().BoolVar(&wait, "wait", false, "show progress and wait for the end; the exit status tells how it ended")
	by := cmd.Flags().Lookup("by")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		dir, err := c.dir()
		if err != nil {
			return err
		}
		d := newClient(dir)
		run, err := c.resumeRun(cmd.Context(), d, by.Value.String(), args)
		if err != nil {
			return err
		}
		say(cmd, "run %d goes on: %d of %d points are there", run.ID, run.Measured, run.Planned)
		if !wait {
			return nil
		}
		return follow(cmd, d, run)
	}
	return cmd
}

func (c *cli) resumeRun(ctx context.Context, d *client, by string, args []string) (sweeps.Run, error) {
	var all web.Runs
	if err := d.do(ctx, http.MethodGet, "/api/runs", nil, &all); err != nil {
		return sweeps.Run{}, err
	}
	run, err := pick(all.Runs, args)
	if err != nil {
		return run, err
	}
	if run.State == sweeps.HeldState {
		return run, d.do(ctx, http.MethodPost, "/api/continue", web.ByRequest{By: by}, nil)
	}
	return run, d.do(ctx, http.MethodPost, fmt.Sprintf("/api/runs/%d/resume", run.ID), web.ResumeRequest{Operator: by}, &run)
}

// pick is the run named, or the newest where it can go on. An older one is never
// implied: resuming energises, and a run of some weeks ago has another board on the bench.
func pick(runs []sweeps.Run, args []string) (sweeps.Run, error) {
	if len(args) == 1 {
		id, err := runID(args[0])
		if err != nil {
			return sweeps.Run{}, err
		}
		for _, r := range runs {
			if r.ID == id {
				return r, nil
			}
		}
		return sweeps.Run{}, fmt.Errorf("there is no run %d; 'nightbench runs' lists them", id)
	}
	if len(runs) == 0 {
		return sweeps.Run{}, fmt.Errorf("there is no run yet; 'nightbench start PLAN' starts one")
	}
	newest := runs[0]
	if goesOn(newest) {
		return newest, nil
	}
	for _, r := range runs[1:] {
		if goesOn(r) {
			return sweeps.Run{}, fmt.Errorf("the newest run, %d, is %s; an older one has to be named: 'nightbench resume %d' goes on with plan %q, %s, begun %s, %d of %d points",
				newest.ID, newest.State, r.ID, r.Plan, r.State, r.StartedAt.Local().Format("2006-01-02 15:04"), r.Measured, r.Planned)
		}
	}
	return sweeps.Run{}, fmt.Errorf("no run can be resumed: none is held, interrupted, stopped, tripped or failed")
}

// goesOn tells whether a run is held or ended before its plan was done.
func goesOn(r sweeps.Run) bool {
	return r.State == sweeps.HeldState || r.State.Ended() && r.State != sweeps.Done
}

func runID(text string) (int64, error) {
	id, err := strconv.ParseInt(text, 10, 64)
	if err != nil || id < 1 {
		return 0, usage("%q is no run: give its number, as 'nightbench runs' lists it", text)
	}
	return id, nil
}
