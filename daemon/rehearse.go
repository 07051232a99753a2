package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"text/tabwriter"
	"time"

	"nightbench/daemon/app"
	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/instruments/si"
	"nightbench/sweeps"

	"github.com/spf13/cobra"
)

func (c *cli) rehearse() *cobra.Command {
	var benchPath string
	cmd := c.withJSON(&cobra.Command{
		Use:   "rehearse PLAN",
		Short: "Go through a plan against the prediction, touching no instrument",
		Args:  cobra.ExactArgs(1),
	})
	cmd.Flags().StringVar(&benchPath, "bench", "", "bench file (default: bench.toml beside the plan)")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		plan, board, err := sweeps.ReadPlan(args[0])
		if err != nil {
			return err
		}
		wiring, err := wiringFor(args[0], benchPath)
		if err != nil {
			return err
		}
		r, err := app.Rehearse(plan, board, wiring)
		if err != nil {
			return &exit{exitUsage, err}
		}
		if c.json {
			return printJSON(cmd.OutOrStdout(), r)
		}
		return printRehearsal(cmd, plan, board, r)
	}
	return cmd
}

// wiringFor reads the bench file; nil when none was named and none lies beside the plan.
func wiringFor(plan, path string) (*instruments.Wiring, error) {
	named := path != ""
	if !named {
		path = filepath.Join(filepath.Dir(plan), "bench.toml")
		if _, err := os.Stat(path); errors.Is(err, fs.ErrNotExist) {
			return nil, nil
		}
	}
	f, err := bench.Read(path)
	if err != nil {
		return nil, err
	}
	return &f.Wiring, nil
}

func printRehearsal(cmd *cobra.Command, plan sweeps.Plan, board sweeps.Board, r app.Rehearsal) error {
	say(cmd, "%s on %s %s: %d setpoints", plan.Name, board.Name, board.Revision, len(r.Setpoints))
	_, ambient := app.Ambient(plan)
	say(cmd, "%s", ambient)
	if r.Seconds > 0 {
		say(cmd, "about %s at the least, settling and measuring", time.Duration(r.Seconds*float64(time.Second)).Round(time.Second))
	}
	t := tabwriter.NewWriter(cmd.OutOrStdout(), 0, 0, 2, ' ', 0)
	head := "setpoint\tcode\tway"
	for _, q := range plan.Measure.Quantities {
		head += "\t" + string(q)
	}
	fmt.Fprintln(t, head)
	for _, s := range r.Setpoints {
		line := fmt.Sprintf("%s\t%d\t%s", s.Place, s.PotCode, s.Direction)
		for _, q := range plan.Measure.Quantities {
			p, ok := s.Predictions[q]
			if !ok {
				line += "\t-"
				continue
			}
			line += fmt.Sprintf("\t%s [%s]", si.Format(p.Value, p.Unit), si.FormatRange(p.Low, p.High, p.Unit))
		}
		fmt.Fprintln(t, line)
	}
	if err := t.Flush(); err != nil {
		return err
	}
	for _, f := range r.Findings {
		say(cmd, "caution: %s: %s (at %d of %d setpoints, worst at %s)", f.Name, f.Words, f.Count, len(r.Setpoints), app.Where(board, f.Setting))
	}
	for _, n := range r.NotJudged {
		say(cmd, "not judged: %s", n)
	}
	say(cmd, "\n%s", cautions)
	return nil
}
