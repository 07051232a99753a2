package main

import (
	"errors"
	"fmt"
	"io/fs"
	"math"
	"os"

	"nightbench/instruments/si"
	"nightbench/sweeps/pulse"
	"nightbench/sweeps/pulse/capture"
	"nightbench/sweeps/pulse/figure"

	"github.com/spf13/cobra"
)

// pulseOptions are the flags of pulse.
type pulseOptions struct {
	figure                                string
	expect, threshold, gain, offset, base string
	budget                                bool
}

func (c *cli) pulse() *cobra.Command {
	var o pulseOptions
	cmd := c.withJSON(&cobra.Command{
		Use:   "pulse FILE.csv",
		Short: "Pulse parameters of a waveform a scope exported, with uncertainties",
		Long: "Reads a capture as scopes export it, says what it took the file for, and gives the pulse\n" +
			"parameters of each channel after IEEE Std 181, each with its standard uncertainty.\n" +
			"A file does not tell how well its scope was calibrated: give --gain, --offset and\n" +
			"--time-base (the maker's limits of error) to have them counted.",
		Args: cobra.ExactArgs(1),
	})
	f := cmd.Flags()
	f.StringVarP(&o.figure, "output", "o", "", "draw the waveform, its levels and instants into this SVG file")
	f.StringVar(&o.expect, "expect", "", "about the amplitude there should be, like 9V: a tenfold departure is flagged as a wrong probe factor")
	f.StringVar(&o.threshold, "threshold", "", "tells a constant high from a constant low, like 4.5V")
	f.StringVar(&o.gain, "gain", "", "limit of error of the scope's gain, like 3%")
	f.StringVar(&o.offset, "offset", "", "limit of error of the scope's zero, like 20mV")
	f.StringVar(&o.base, "time-base", "", "limit of error of the scope's time base, like 0.005%")
	f.BoolVar(&o.budget, "budget", false, "print what each uncertainty is made of")
	cmd.RunE = func(cmd *cobra.Command, args []string) error { return c.runPulse(cmd, args[0], o) }
	return cmd
}

// waveform is a channel of a capture with what was found in it.
type waveform struct {
	capture.Channel
	result pulse.Result
}

func (c *cli) runPulse(cmd *cobra.Command, path string, o pulseOptions) error {
	known, opts, err := o.read()
	if err != nil {
		return err
	}
	file, all, err := analyseCapture(path, known, opts)
	if err != nil {
		return err
	}
	if o.figure != "" {
		if err := drawCapture(o.figure, path, file.ReadAs, all); err != nil {
			return err
		}
	}
	if c.json {
		return printJSON(cmd.OutOrStdout(), pulseJSON(path, file, all))
	}
	return printPulse(cmd, path, file, all, o)
}

// read turns the flags into what is known of the scope, as a record without samples, and of the waveform.
func (o pulseOptions) read() (known pulse.Record, opts pulse.Options, err error) {
	var expect, threshold, offset si.Voltage
	var gain, base si.Ratio
	for _, f := range []struct {
		name, text string
		into       interface{ UnmarshalText([]byte) error }
	}{{"expect", o.expect, &expect}, {"threshold", o.threshold, &threshold}, {"gain", o.gain, &gain}, {"offset", o.offset, &offset}, {"time-base", o.base, &base}} {
		if f.text == "" {
			continue
		}
		if err := f.into.UnmarshalText([]byte(f.text)); err != nil {
			return known, opts, usage("--%s: %w", f.name, err)
		}
	}
	// Makers' limits of error are rectangular (GUM 4.3.7).
	known.GainU, known.OffsetU, known.TimeBaseU = math.Abs(gain.SI())/math.Sqrt(3), math.Abs(offset.SI())/math.Sqrt(3), math.Abs(base.SI())/math.Sqrt(3)
	opts.Expected = expect.SI()
	if o.threshold != "" {
		v := threshold.SI()
		opts.Threshold = &v
	}
	return known, opts, nil
}

// analyseCapture reads a capture and analyses each of its channels. What cannot be read has exit status 2.
func analyseCapture(path string, known pulse.Record, opts pulse.Options) (capture.File, []waveform, error) {
	f, err := os.Open(path)
	if err != nil {
		return capture.File{}, nil, &exit{exitUsage, err}
	}
	defer f.Close()
	file, err := capture.Read(f, path)
	var bad *capture.Error
	var unreadable *fs.PathError
	if errors.As(err, &bad) || errors.As(err, &unreadable) {
		return file, nil, &exit{exitUsage, err}
	}
	if err != nil {
		return file, nil, fmt.Errorf("read %s: %w", path, err)
	}
	var all []waveform
	for _, ch := range file.Channels {
		r := ch.Record
		r.Instrument, r.GainU, r.OffsetU, r.TimeBaseU = ch.Name, known.GainU, known.OffsetU, known.TimeBaseU
		res, err := pulse.Analyse(r, opts)
		if err != nil {
			return file, nil, &exit{exitUsage, fmt.Errorf("%s: %s: %w", path, ch.Name, err)}
		}
		if ch.Untimed {
			res = res.Untimed()
		}
		res.Flags = append(res.Flags, ch.Flags...)
		all = append(all, waveform{ch, res})
	}
	return file, all, nil
}

func drawCapture(to, path, readAs string, all []waveform) error {
	var panels []figure.Panel
	for _, w := range all {
		panels = append(panels, figure.Panel{Name: w.Name, Unit: w.Unit, Untimed: w.Untimed, Record: w.Record, Result: w.result})
	}
	f, err := os.Create(to)
	if err != nil {
		return err
	}
	return errors.Join(figure.Write(f, path, readAs, panels), f.Close())
}
