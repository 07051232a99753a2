package main

import (
	"context"
	"fmt"
	"net/http"
	"path/filepath"
	"time"

	"nightbench/daemon/web"
	"nightbench/sweeps"

	"github.com/spf13/cobra"
	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"
)

func (c *cli) start() *cobra.Command {
	var req web.StartRequest
	var wait bool
	cmd := &cobra.Command{
		Use:   "start PLAN",
		Short: "Start a run of a plan on the bench the daemon holds",
		Long:  "start asks the daemon of the state folder to run a plan.\n\n" + cautions,
		Args:  cobra.ExactArgs(1),
	}
	cmd.Flags().StringVar(&req.BoardSerial, "board-serial", "", "serial of the specimen under test")
	cmd.Flags().StringVar(&req.Operator, "operator", "", "initials of who starts it")
	cmd.Flags().StringVar(&req.Note, "note", "", "a note, kept with the run")
	cmd.Flags().BoolVar(&wait, "wait", false, "show progress and wait for the end; the exit status tells how it ended")
	c.withJSON(cmd)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		dir, err := c.dir()
		if err != nil {
			return err
		}
		if req.Plan, err = filepath.Abs(args[0]); err != nil {
			return err
		}
		if _, _, err := sweeps.ReadPlan(req.Plan); err != nil {
			return err
		}
		d := newClient(dir)
		var run sweeps.Run
		if err := d.do(cmd.Context(), http.MethodPost, "/api/runs", req, &run); err != nil {
			return err
		}
		switch {
		case wait:
			return follow(cmd, d, run)
		case c.json:
			return printJSON(cmd.OutOrStdout(), run)
		}
		say(cmd, "run %d started: %d setpoints", run.ID, run.Planned)
		return nil
	}
	return cmd
}

// followEvery is how often progress is asked for.
const followEvery = 300 * time.Millisecond

// follow shows a run's progress until it is over; the error tells how it ended.
func follow(cmd *cobra.Command, d *client, run sweeps.Run) error {
	progress := mpb.NewWithContext(cmd.Context(), mpb.WithOutput(cmd.ErrOrStderr()), mpb.WithWidth(48))
	left := ""
	bar := progress.AddBar(int64(run.Planned),
		mpb.PrependDecorators(decor.Name(fmt.Sprintf("run %d ", run.ID)), decor.CountersNoUnit("%d of %d points ")),
		mpb.AppendDecorators(decor.Any(func(decor.Statistics) string { return left })))
	end, err := poll(cmd, d, run, func(s web.Status, r sweeps.Run) {
		left = timeLeft(s.Vitals.TimeLeft)
		bar.SetCurrent(int64(r.Measured))
	})
	if err == nil && end.Measured == end.Planned {
		bar.SetCurrent(int64(end.Planned))
	}
	bar.Abort(false)
	progress.Wait()
	if err != nil {
		return fmt.Errorf("%w; the run goes on in the daemon", err)
	}
	return ended(cmd, end)
}

// poll asks the daemon until the run is over.
func poll(cmd *cobra.Command, d *client, run sweeps.Run, show func(web.Status, sweeps.Run)) (sweeps.Run, error) {
	tick := time.NewTicker(followEvery)
	defer tick.Stop()
	for {
		var s web.Status
		var r web.RunDetail
		if err := d.do(cmd.Context(), http.MethodGet, "/api/status", nil, &s); err != nil {
			return run, err
		}
		if err := d.do(cmd.Context(), http.MethodGet, fmt.Sprintf("/api/runs/%d", run.ID), nil, &r); err != nil {
			return run, err
		}
		show(s, r.Run)
		if r.Run.State.Ended() {
			return r.Run, nil
		}
		select {
		case <-tick.C:
		case <-cmd.Context().Done():
			return run, context.Cause(cmd.Context())
		}
	}
}

// ended says how a run ended and turns it into an exit status.
func ended(cmd *cobra.Command, r sweeps.Run) error {
	words := fmt.Sprintf("run %d %s: %s; %d of %d points, %d flagged", r.ID, r.State, r.Reason, r.Measured, r.Planned, r.Flagged)
	switch r.State {
	case sweeps.Done:
		say(cmd, "%s", words)
		return nil
	case sweeps.Tripped:
		return &exit{exitTripped, fmt.Errorf("%s", words)}
	case sweeps.Stopped:
		return &exit{exitInterrupted, fmt.Errorf("%s", words)}
	}
	return fmt.Errorf("%s", words)
}

func timeLeft(seconds *float64) string {
	if seconds == nil {
		return ""
	}
	d := time.Duration(*seconds * float64(time.Second))
	switch {
	case d >= time.Hour:
		return fmt.Sprintf("about %d h %02d min left", int(d.Hours()), int(d.Minutes())%60)
	case d >= time.Minute:
		return fmt.Sprintf("about %d min left", int(d.Minutes()+0.5))
	}
	return fmt.Sprintf("about %d s left", int(d.Seconds()+0.5))
}
