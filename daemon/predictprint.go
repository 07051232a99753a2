package main

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"text/tabwriter"

	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"

	"github.com/spf13/cobra"
)

// sweepOf reads --sweep NAME=FROM:TO:POINTS:SPACING.
func sweepOf(board sweeps.Board, s predict.Setting, o predictOptions) ([]predict.Setting, error) {
	want := "pot_resistance"
	if board.Timing.Network == sweeps.Wiper {
		want = "pot_position"
	}
	name, rest, _ := strings.Cut(o.sweep, "=")
	parts := strings.Split(rest, ":")
	if name != want || len(parts) != 4 || !usesSetting(board) {
		return nil, usage("--sweep %q: write it like %s=%s", o.sweep, want, map[string]string{"pot_resistance": "1k:100k:25:log", "pot_position": "0.05:0.95:19:lin"}[want])
	}
	from, err := potValue(board, parts[0])
	if err != nil {
		return nil, usage("--sweep from: %w", err)
	}
	to, err := potValue(board, parts[1])
	if err != nil {
		return nil, usage("--sweep to: %w", err)
	}
	n, err := strconv.Atoi(parts[2])
	if err != nil || n < 2 || n > 10_000 {
		return nil, usage("--sweep: %q points: give a whole number from 2 to 10000", parts[2])
	}
	var at func(share float64) float64
	switch parts[3] {
	case "log":
		if !(from > 0 && to > 0) {
			return nil, usage("--sweep: logarithmic spacing needs both ends above zero")
		}
		at = func(x float64) float64 { return from * math.Pow(to/from, x) }
	case "lin", "linear":
		at = func(x float64) float64 { return from + (to-from)*x }
	default:
		return nil, usage("--sweep: spacing %q is neither log nor lin", parts[3])
	}
	all := make([]predict.Setting, n)
	for i := range all {
		all[i] = s
		all[i].Pot = at(float64(i) / float64(n-1))
	}
	return all, nil
}

// predictionOf is a prediction as JSON.
func predictionOf(board sweeps.Board, at predict.Setting, values map[sweeps.Quantity]sweeps.Prediction, flags []sweeps.Flag) result {
	r := result{Board: board.Name, Setpoint: map[string]any{"supply_voltage": at.Supply, "temperature": at.Temperature}, Quantities: map[sweeps.Quantity]any{}, Flags: orNone(flags)}
	switch {
	case board.Timing.Network == sweeps.Wiper:
		r.Setpoint["pot_position"] = at.Pot
	case board.Timing.UsesPot():
		r.Setpoint["pot_resistance"] = at.Pot
	}
	for q, p := range values {
		r.Quantities[q] = p
	}
	return r
}

// where names a setting in words.
func where(board sweeps.Board, at predict.Setting) string {
	w := si.Format(at.Supply, si.Volt)
	switch {
	case board.Timing.Network == sweeps.Wiper:
		w += ", pot at " + si.Percent(at.Pot)
	case board.Timing.UsesPot():
		w += ", pot " + si.Format(at.Pot, si.Ohm)
	}
	return w
}

func printPrediction(cmd *cobra.Command, board sweeps.Board, p prediction, o predictOptions) error {
	say(cmd, "%s %s at %s, ambient %g °C; 95 %% band of %d boards drawn within tolerance", board.Name, board.Revision, where(board, p.at), p.at.Temperature, o.draws)
	t := tabwriter.NewWriter(cmd.OutOrStdout(), 0, 0, 2, ' ', 0)
	for _, q := range sweeps.Quantities {
		if x, ok := p.values[q.Name]; ok {
			fmt.Fprintf(t, "%s\t%s\t%s\n", spaced(q.Name), si.Format(x.Value, x.Unit), si.FormatRange(x.Low, x.High, x.Unit))
		}
	}
	if len(p.Sensitivities) > 0 {
		fmt.Fprintf(t, "\npart, up by 1 %%\tduty\tfrequency\taverage voltage\tmotor current\n")
		for _, s := range p.Sensitivities {
			fmt.Fprintf(t, "%s\t%s\t%s\t%s\t%s\n", strings.ReplaceAll(s.Part, "_", " "), share(s, sweeps.Duty), share(s, sweeps.Frequency), share(s, sweeps.AverageVoltage), share(s, sweeps.MotorCurrent))
		}
	}
	if p.Stress != nil {
		fmt.Fprintf(t, "\nstress\trunning\trotor held\trating\n")
		for i, s := range p.Stress.Running {
			fmt.Fprintf(t, "%s, %s\t%s\t%s\t%s\n", s.Part, s.What, stressed(s), stressed(p.Stress.Locked[i]), rating(s))
		}
	}
	if err := t.Flush(); err != nil {
		return err
	}
	for _, f := range p.Flags {
		say(cmd, "* %s: %s", f.Name, f.Words)
	}
	return nil
}

func spaced(q sweeps.Quantity) string { return strings.ReplaceAll(string(q), "_", " ") }

func share(s predict.Sensitivity, q sweeps.Quantity) string {
	x, ok := s.Values[q]
	if !ok {
		return "-"
	}
	return strings.Replace(fmt.Sprintf("%+.3f %%", x), "-", "−", 1)
}

func stressed(s predict.Stress) string {
	if s.Rating == 0 {
		return si.Format(s.Value, s.Unit)
	}
	return fmt.Sprintf("%s (%.0f %%)", si.Format(s.Value, s.Unit), 100*s.Share())
}

func rating(s predict.Stress) string {
	if s.Rating == 0 {
		return "not known"
	}
	return si.Format(s.Rating, s.Unit)
}

// printCurve writes a line a setting, the quantities a plan logs most often.
func printCurve(cmd *cobra.Command, board sweeps.Board, all []prediction) error {
	shown := []sweeps.Quantity{sweeps.Duty, sweeps.Frequency, sweeps.AverageVoltage, sweeps.OutputDrop, sweeps.MotorCurrent, sweeps.SupplyCurrent}
	t := tabwriter.NewWriter(cmd.OutOrStdout(), 0, 0, 2, ' ', 0)
	head := "setting"
	for _, q := range shown {
		head += "\t" + spaced(q)
	}
	fmt.Fprintln(t, head)
	for _, p := range all {
		line := where(board, p.at)
		for _, q := range shown {
			x, ok := p.values[q]
			if !ok {
				line += "\t-"
				continue
			}
			line += fmt.Sprintf("\t%s [%s]", si.Format(x.Value, x.Unit), si.FormatRange(x.Low, x.High, x.Unit))
		}
		fmt.Fprintln(t, line)
	}
	if err := t.Flush(); err != nil {
		return err
	}
	for _, p := range all {
		for _, f := range p.Flags {
			say(cmd, "* %s: %s: %s", where(board, p.at), f.Name, f.Words)
		}
	}
	return nil
}
