package main

import (
	"fmt"
	"strings"
	"text/tabwriter"

	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"

	"github.com/spf13/cobra"
)

// bandDraws and bandSeed are how a band is drawn where nobody asks for another: reproducible.
const (
	bandDraws = 1000
	bandSeed  = 1
)

func (c *cli) predict() *cobra.Command {
	var supply, pot string
	cmd := c.withJSON(&cobra.Command{
		Use:   "predict BOARD --supply 9V [--pot 33k]",
		Short: "Compute what a board's schematic gives, with its 95 % band",
		Args:  cobra.ExactArgs(1),
	})
	cmd.Flags().StringVar(&supply, "supply", "", "supply voltage, like 9V")
	cmd.Flags().StringVar(&pot, "pot", "", "resistance of the bench's pot, like 33k, taken as exact")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		board, err := sweeps.ReadBoard(args[0])
		if err != nil {
			return err
		}
		at, err := settingOf(board, supply, pot)
		if err != nil {
			return err
		}
		m, err := predict.New(board, predict.Options{})
		if err != nil {
			return &exit{exitUsage, err}
		}
		if _, err := m.At(at); err != nil {
			return &exit{exitUsage, err}
		}
		values, flags := m.Draw(bandDraws, bandSeed).At(at)
		if c.json {
			return printJSON(cmd.OutOrStdout(), predictionOf(board, at, values, flags))
		}
		return printPrediction(cmd, board, at, values, flags)
	}
	return cmd
}

// settingOf reads the flags; what is missing or not asked for is said.
func settingOf(board sweeps.Board, supply, pot string) (predict.Setting, error) {
	s := predict.Setting{Temperature: predict.Reference}
	var v si.Voltage
	if supply == "" {
		return s, usage("predict: --supply is missing; write it like --supply 9V")
	}
	if err := v.UnmarshalText([]byte(supply)); err != nil {
		return s, usage("--supply: %w", err)
	}
	s.Supply = v.SI()
	switch {
	case board.Timing.UsesPot() && pot == "":
		return s, usage("predict: this board has the bench's pot in its timing network; say where it stands, like --pot 33k")
	case !board.Timing.UsesPot() && pot != "":
		return s, usage("predict: this board has no pot; leave --pot out")
	case pot == "":
		return s, nil
	}
	var r si.Resistance
	if err := r.UnmarshalText([]byte(pot)); err != nil {
		return s, usage("--pot: %w", err)
	}
	s.Pot = r.SI()
	return s, nil
}

// predictionOf is a prediction as JSON.
func predictionOf(board sweeps.Board, at predict.Setting, values map[sweeps.Quantity]sweeps.Prediction, flags []sweeps.Flag) result {
	r := result{Board: board.Name, Setpoint: map[string]any{"supply_voltage": at.Supply, "temperature": at.Temperature}, Quantities: map[sweeps.Quantity]any{}, Flags: orNone(flags)}
	if board.Timing.UsesPot() {
		r.Setpoint["pot_resistance"] = at.Pot
	}
	for q, p := range values {
		r.Quantities[q] = p
	}
	return r
}

func printPrediction(cmd *cobra.Command, board sweeps.Board, at predict.Setting, values map[sweeps.Quantity]sweeps.Prediction, flags []sweeps.Flag) error {
	where := si.Format(at.Supply, si.Volt)
	if board.Timing.UsesPot() {
		where += ", pot " + si.Format(at.Pot, si.Ohm)
	}
	say(cmd, "%s %s at %s, parts at %g °C; 95 %% band of %d boards drawn within tolerance", board.Name, board.Revision, where, at.Temperature, bandDraws)
	t := tabwriter.NewWriter(cmd.OutOrStdout(), 0, 0, 2, ' ', 0)
	for _, q := range sweeps.Quantities {
		if p, ok := values[q.Name]; ok {
			fmt.Fprintf(t, "%s\t%s\t%s\n", strings.ReplaceAll(string(q.Name), "_", " "), si.Format(p.Value, p.Unit), si.FormatRange(p.Low, p.High, p.Unit))
		}
	}
	if err := t.Flush(); err != nil {
		return err
	}
	for _, f := range flags {
		say(cmd, "* %s: %s", f.Name, f.Words)
	}
	return nil
}
