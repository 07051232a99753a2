package main

import (
	"fmt"
	"math"
	"strings"
	"text/tabwriter"

	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/pulse"
	"nightbench/sweeps/pulse/capture"

	"github.com/spf13/cobra"
)

// pulseReport is a capture as --json prints it.
type pulseReport struct {
	File     string          `json:"file"`
	ReadAs   string          `json:"read_as"`
	Channels []channelReport `json:"channels"`
}

type channelReport struct {
	Name       string                    `json:"name"`
	Class      pulse.Class               `json:"class"`
	Quantities map[string]quantityReport `json:"quantities"`
	Flags      []sweeps.Flag             `json:"flags"`
}

type quantityReport struct {
	Value *float64      `json:"value"` // null: flags say why
	U     *float64      `json:"u"`
	DOF   *float64      `json:"dof"` // null: infinitely many
	Unit  si.Unit       `json:"unit"`
	Flags []sweeps.Flag `json:"flags"`
}

func pulseJSON(path string, file capture.File, all []waveform) pulseReport {
	out := pulseReport{File: path, ReadAs: file.ReadAs, Channels: []channelReport{}}
	for _, w := range all {
		c := channelReport{Name: w.Name, Class: w.result.Class, Quantities: map[string]quantityReport{}, Flags: flagsOf(w.result.Flags)}
		for _, p := range pulse.Parameters {
			c.Quantities[p.Name] = quantityReport{Unit: w.unit(p.Unit), Flags: flagsOf(w.result.Why(p.Name))}
		}
		for _, q := range w.result.Quantities {
			v := q.Value()
			r := quantityReport{Value: &v.X, U: &v.U, Unit: w.unit(q.Unit), Flags: flagsOf(q.Flags)}
			if !math.IsInf(v.DOF, 0) {
				r.DOF = &v.DOF
			}
			c.Quantities[q.Name] = r
		}
		out.Channels = append(out.Channels, c)
	}
	return out
}

// unit is a quantity's unit, of a channel that may be a current.
func (w waveform) unit(u string) si.Unit {
	if u == "V" {
		u = w.Unit
	}
	return si.Unit(u)
}

func flagsOf(all []pulse.Flag) []sweeps.Flag {
	out := []sweeps.Flag{}
	for _, f := range all {
		out = append(out, sweeps.Flag{Name: f.Name, Words: f.Words})
	}
	return out
}

func printPulse(cmd *cobra.Command, path string, file capture.File, all []waveform, o pulseOptions) error {
	say(cmd, "%s read as: %s", path, file.ReadAs)
	for _, w := range all {
		say(cmd, "")
		if err := w.print(cmd, o); err != nil {
			return err
		}
	}
	say(cmd, "\nvalue(standard uncertainty on its last digits); * flagged")
	if o.gain == "" && o.offset == "" && o.base == "" {
		say(cmd, "the scope's own errors of gain, zero and time base are not counted: give --gain, --offset, --time-base")
	}
	if o.figure != "" {
		say(cmd, "drawn in %s", o.figure)
	}
	return nil
}

func (w waveform) print(cmd *cobra.Command, o pulseOptions) error {
	head := fmt.Sprintf("%s: %s", w.Name, w.result.Class)
	switch n := w.result.Periods; {
	case n == 1:
		head += ", one whole period"
	case n > 1:
		head += fmt.Sprintf(", %d whole periods", n)
	}
	say(cmd, "%s", head)
	t := tabwriter.NewWriter(cmd.OutOrStdout(), 0, 0, 2, ' ', 0)
	for _, q := range w.result.Quantities {
		mark := ""
		if len(q.Flags) > 0 {
			mark = "*"
		}
		fmt.Fprintf(t, "  %s\t%s%s\n", w.called(q.Name), si.FormatU(q.X, q.U(), w.unit(q.Unit)), mark)
		if o.budget {
			w.printBudget(t, q)
		}
	}
	for _, p := range pulse.Parameters[:5] {
		if _, ok := w.result.Get(p.Name); !ok {
			fmt.Fprintf(t, "  %s\tno value\n", w.called(p.Name))
		}
	}
	if err := t.Flush(); err != nil {
		return err
	}
	for _, f := range w.result.Flags {
		say(cmd, "  * %s: %s", f.Name, f.Words)
	}
	return nil
}

// printBudget writes a line a cause: source, type, and what it adds.
func (w waveform) printBudget(t *tabwriter.Writer, q pulse.Quantity) {
	for _, c := range q.Components {
		fmt.Fprintf(t, "  \t  %s (type %s)\t%s\n", c.Source, c.Type, si.Format(math.Abs(c.Share()), w.unit(q.Unit)))
	}
}

// called is a quantity's name in words; a current has an average too.
func (w waveform) called(name string) string {
	if w.Unit != "V" {
		name = strings.TrimSuffix(name, "_voltage")
	}
	return strings.ReplaceAll(name, "_", " ")
}
