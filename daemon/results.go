package main

import (
	"encoding/json"
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// printJSON writes one result, indented, SI numbers.
func printJSON(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetIndent("", "  ")
	e.SetEscapeHTML(false)
	return e.Encode(v)
}

// result is a prediction or a measured point as --json prints it.
type result struct {
	Board      string                  `json:"board"`
	Setpoint   map[string]any          `json:"setpoint"`
	Quantities map[sweeps.Quantity]any `json:"quantities"`
	Flags      []sweeps.Flag           `json:"flags"`
}

// measuredValue is a reading with the prediction beside it.
type measuredValue struct {
	Value     *float64      `json:"value"`
	U         *float64      `json:"u"`
	DOF       *float64      `json:"dof"` // null: infinitely many
	Unit      si.Unit       `json:"unit"`
	Road      string        `json:"road"`
	Flags     []sweeps.Flag `json:"flags"`
	Predicted *predicted    `json:"predicted,omitempty"`
}

type predicted struct {
	Value float64 `json:"value"`
	Low   float64 `json:"low"`
	High  float64 `json:"high"`
}

// resultOf is a measured point as JSON.
func resultOf(board string, p sweeps.Point) result {
	r := result{Board: board, Quantities: map[sweeps.Quantity]any{}, Flags: orNone(p.Flags), Setpoint: map[string]any{
		"index": p.Setpoint.Index, "supply_voltage": p.Setpoint.Supply, "pot_code": p.Setpoint.PotCode,
		"pot_resistance": p.Setpoint.Pot, "direction": p.Setpoint.Direction,
	}}
	if x := p.Setpoint.Position; x > 0 {
		r.Setpoint["pot_position"] = x
	}
	for _, m := range p.Readings {
		v := measuredValue{Value: m.Value, U: m.U, DOF: m.DOF, Unit: m.Unit, Road: m.Road, Flags: orNone(m.Flags)}
		if x, ok := p.Predictions[m.Quantity]; ok {
			v.Predicted = &predicted{x.Value, x.Low, x.High}
		}
		r.Quantities[m.Quantity] = v
	}
	return r
}

func orNone(f []sweeps.Flag) []sweeps.Flag {
	if f == nil {
		return []sweeps.Flag{}
	}
	return f
}

// printPoints writes a table: a line a point, per quantity the measured value
// with its uncertainty and, in brackets, the predicted 95 % band. A star marks a
// flagged reading; the flags follow in words.
func printPoints(w io.Writer, run sweeps.Run, points []sweeps.Point) error {
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	head := []string{"point", "setpoint", "way"}
	for _, q := range run.Quantities {
		head = append(head, strings.ReplaceAll(string(q), "_", " "))
	}
	fmt.Fprintln(t, strings.Join(head, "\t"))
	for _, p := range points {
		cells := []string{fmt.Sprint(p.Setpoint.Index + 1), runner.Place(p.Setpoint), string(p.Setpoint.Direction)}
		for _, q := range run.Quantities {
			cells = append(cells, cell(p, q))
		}
		fmt.Fprintln(t, strings.Join(cells, "\t"))
	}
	if err := t.Flush(); err != nil {
		return err
	}
	printFlags(w, points)
	return nil
}

// cell is one reading: "4.352(12) V [4.310 to 4.410 V]".
func cell(p sweeps.Point, q sweeps.Quantity) string {
	r, ok := p.Reading(q)
	if !ok {
		return ""
	}
	s := "no value"
	if r.Value != nil {
		s = si.FormatU(*r.Value, *r.U, r.Unit)
	}
	if len(r.Flags) > 0 {
		s += "*"
	}
	if x, ok := p.Predictions[q]; ok {
		s += " [" + si.FormatRange(x.Low, x.High, x.Unit) + "]"
	}
	return s
}

func printFlags(w io.Writer, points []sweeps.Point) {
	for _, p := range points {
		for _, f := range p.Flags {
			fmt.Fprintf(w, "* point %d, %s: %s: %s\n", p.Setpoint.Index+1, runner.Place(p.Setpoint), f.Name, f.Words)
		}
		for _, r := range p.Readings {
			for _, f := range r.Flags {
				fmt.Fprintf(w, "* point %d, %s, %s: %s: %s\n", p.Setpoint.Index+1, runner.Place(p.Setpoint), r.Quantity, f.Name, f.Words)
			}
		}
	}
}
