package main

import (
	"context"
	"fmt"
	"text/tabwriter"
	"time"

	"nightbench/daemon/app"
	"nightbench/daemon/store"
	"nightbench/sweeps"

	"github.com/spf13/cobra"
)

// reading opens the state folder's journal for reading, runs f, and closes it.
func (c *cli) reading(ctx context.Context, f func(*store.Store) error) error {
	dir, err := c.dir()
	if err != nil {
		return err
	}
	return reading(ctx, dir, f)
}

func reading(ctx context.Context, dir string, f func(*store.Store) error) error {
	s, err := store.OpenReader(ctx, app.Database(dir))
	if err != nil {
		return err
	}
	defer s.Close(context.WithoutCancel(ctx))
	return f(s)
}

func (c *cli) runs() *cobra.Command {
	cmd := c.withJSON(&cobra.Command{Use: "runs", Short: "List the runs of the journal, newest first", Args: cobra.NoArgs})
	cmd.RunE = func(cmd *cobra.Command, _ []string) error {
		return c.reading(cmd.Context(), func(s *store.Store) error {
			runs, err := s.Runs(cmd.Context())
			if err != nil {
				return err
			}
			if c.json {
				return printJSON(cmd.OutOrStdout(), runs)
			}
			return listRuns(cmd, runs)
		})
	}
	return cmd
}

func listRuns(cmd *cobra.Command, runs []sweeps.Run) error {
	if len(runs) == 0 {
		say(cmd, "no run yet")
		return nil
	}
	t := tabwriter.NewWriter(cmd.OutOrStdout(), 0, 0, 2, ' ', 0)
	fmt.Fprintln(t, "run\tbegun\tstate\tpoints\tflagged\tplan\tboard\tserial\tby\tpace\twhy it ended")
	for _, r := range runs {
		fmt.Fprintf(t, "%d\t%s\t%s\t%d of %d\t%d\t%s\t%s\t%s\t%s\t%g\t%s\n", r.ID, r.StartedAt.Local().Format(time.DateTime), r.State,
			r.Measured, r.Planned, r.Flagged, r.Plan, r.Board+" "+r.Revision, r.BoardSerial, r.Operator, r.Pace, r.Reason)
	}
	return t.Flush()
}

func (c *cli) show() *cobra.Command {
	cmd := c.withJSON(&cobra.Command{Use: "show RUN", Short: "Print a run's points with uncertainties and predicted bands", Args: cobra.ExactArgs(1)})
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		id, err := runID(args[0])
		if err != nil {
			return err
		}
		return c.reading(cmd.Context(), func(s *store.Store) error { return c.showRun(cmd, s, id) })
	}
	return cmd
}

func (c *cli) showRun(cmd *cobra.Command, s *store.Store, id int64) error {
	run, err := s.Run(cmd.Context(), id)
	if err != nil {
		return err
	}
	points, err := s.Points(cmd.Context(), id)
	if err != nil {
		return err
	}
	if c.json {
		out := struct {
			Run    sweeps.Run `json:"run"`
			Points []result   `json:"points"`
		}{run, []result{}}
		for _, p := range points {
			out.Points = append(out.Points, resultOf(run.Board, p))
		}
		return printJSON(cmd.OutOrStdout(), out)
	}
	return printRun(cmd, run, points)
}

func printRun(cmd *cobra.Command, run sweeps.Run, points []sweeps.Point) error {
	say(cmd, "run %d: %s on %s %s, bench %s, begun %s", run.ID, run.Plan, run.Board, run.Revision, run.Bench, run.StartedAt.Local().Format(time.DateTime))
	sayPace(cmd, run.Pace)
	if ambient := app.AmbientOf(run); ambient != "" {
		say(cmd, "%s", ambient)
	}
	say(cmd, "%s: %s; %d of %d points, %d flagged", run.State, run.Reason, run.Measured, run.Planned, run.Flagged)
	say(cmd, "measured value(standard uncertainty on its last digits) [predicted 95 %% band]; * flagged\n")
	return printPoints(cmd.OutOrStdout(), run, points)
}
