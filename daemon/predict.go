package main

import (
	"errors"

	"nightbench/daemon/app"
	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"

	"github.com/spf13/cobra"
)

// bandDraws and bandSeed are how a band is drawn where nobody asks for another: reproducible.
const (
	bandDraws = app.BandDraws
	bandSeed  = app.BandSeed
	mostDraws = 1_000_000
)

// predictOptions are the flags of predict.
type predictOptions struct {
	supply, pot, temperature, sweep, bench string
	draws                                  int
	sensitivities, stress                  bool
}

func (c *cli) predict() *cobra.Command {
	var o predictOptions
	cmd := c.withJSON(&cobra.Command{
		Use:   "predict BOARD --supply 9V [--pot 33k]",
		Short: "Compute what a board's schematic gives, with its 95 % band",
		Args:  cobra.ExactArgs(1),
	})
	f := cmd.Flags()
	f.StringVar(&o.supply, "supply", "", "supply voltage, like 9V")
	f.StringVar(&o.pot, "pot", "", "resistance of the bench's pot, like 33k, taken as exact; for a wiper network the share of the track in the charging path, like 0.35")
	f.StringVar(&o.temperature, "temperature", "27 degC", "ambient temperature")
	f.IntVar(&o.draws, "band", bandDraws, "how many boards to draw within tolerance for the 95 % band")
	f.BoolVar(&o.sensitivities, "sensitivities", false, "how much each part moves each quantity, in percent a percent")
	f.BoolVar(&o.stress, "stress", false, "each part's load against its rating, running and with the rotor held")
	f.StringVar(&o.sweep, "sweep", "", "a curve along the pot: pot_resistance=1k:100k:25:log (or lin; pot_position=0.05:0.95:19:lin)")
	f.StringVar(&o.bench, "bench", "", "bench file whose pot stands in the timing network: what it bears, its track (default: bench.toml beside the board)")
	cmd.RunE = func(cmd *cobra.Command, args []string) error { return c.runPredict(cmd, args[0], o) }
	return cmd
}

func (c *cli) runPredict(cmd *cobra.Command, path string, o predictOptions) error {
	board, err := sweeps.ReadBoard(path)
	if err != nil {
		return err
	}
	if o.draws < 1 || o.draws > mostDraws {
		return usage("--band %d: give how many boards to draw, from 1 to %d", o.draws, mostDraws)
	}
	settings, err := settingsOf(board, o)
	if err != nil {
		return err
	}
	wiring, err := potOf(board, o.bench)
	if err != nil {
		return err
	}
	m, err := predict.New(board, app.AloneOptions(board, wiring))
	if err != nil {
		return &exit{exitUsage, err}
	}
	var all []prediction
	ensemble := m.Draw(o.draws, bandSeed)
	for _, s := range settings {
		p, err := predictAt(m, ensemble, s, o)
		if err != nil {
			return &exit{exitUsage, err}
		}
		all = append(all, p)
	}
	switch {
	case c.json && o.sweep == "":
		return printJSON(cmd.OutOrStdout(), all[0])
	case c.json:
		return printJSON(cmd.OutOrStdout(), struct {
			Board string       `json:"board"`
			Curve []prediction `json:"curve"`
		}{board.Name, all})
	case o.sweep != "":
		return printCurve(cmd, board, all)
	}
	return printPrediction(cmd, board, all[0], o)
}

// potOf reads the bench file of a board whose timing network the bench's pot stands in; nil where it doesn't, or none is there.
func potOf(board sweeps.Board, path string) (*instruments.Wiring, error) {
	switch {
	case board.Timing.UsesPot():
		return wiringFor(board.Path, path)
	case path != "":
		return nil, usage(`predict: only a board with the bench's pot in its timing network needs the bench; leave --bench out`)
	}
	return nil, nil
}

// prediction is what predict prints: a result, and what was asked for besides.
type prediction struct {
	result
	Sensitivities []predict.Sensitivity `json:"sensitivities,omitempty"`
	Stress        *predict.StressTable  `json:"stress,omitempty"`

	at     predict.Setting
	values map[sweeps.Quantity]sweeps.Prediction
}

// predictAt computes one setting. What a plan would be refused for stands among the flags.
func predictAt(m *predict.Model, e *predict.Ensemble, s predict.Setting, o predictOptions) (prediction, error) {
	if _, err := m.At(s); err != nil {
		return prediction{}, err
	}
	p := prediction{at: s}
	var flags []sweeps.Flag
	p.values, flags = e.At(s)
	findings, err := m.Judge([]predict.Setting{s})
	if err != nil {
		return p, err
	}
	for _, f := range findings {
		if f.Refuse {
			flags = append(flags, sweeps.Flag{Name: f.Name, Words: "a plan would be refused: " + f.Words})
		}
	}
	p.result = predictionOf(m.Board(), s, p.values, flags)
	var errs []error
	if o.sensitivities {
		p.Sensitivities, err = m.Sensitivities(s)
		errs = append(errs, err)
	}
	if o.stress {
		table, err := m.Stress(s)
		p.Stress = &table
		errs = append(errs, err)
	}
	return p, errors.Join(errs...)
}

// settingsOf reads the flags; what is missing or not asked for is said.
func settingsOf(board sweeps.Board, o predictOptions) ([]predict.Setting, error) {
	var s predict.Setting
	var v si.Voltage
	var t si.Temperature
	if o.supply == "" {
		return nil, usage("predict: --supply is missing; write it like --supply 9V")
	}
	if err := v.UnmarshalText([]byte(o.supply)); err != nil {
		return nil, usage("--supply: %w", err)
	}
	if err := t.UnmarshalText([]byte(o.temperature)); err != nil {
		return nil, usage("--temperature: %w", err)
	}
	s.Supply, s.Temperature = v.SI(), t.SI()
	if o.sweep != "" {
		return sweepOf(board, s, o)
	}
	switch {
	case board.Timing.UsesPot() && o.pot == "":
		return nil, usage("predict: this board has the bench's pot in its timing network; say where it stands, like --pot %s", potLike(board))
	case !usesSetting(board) && o.pot != "":
		return nil, usage("predict: this board has no pot; leave --pot out")
	case o.pot == "":
		return []predict.Setting{s}, nil
	}
	var err error
	s.Pot, err = potValue(board, o.pot)
	if err != nil {
		return nil, usage("--pot: %w", err)
	}
	return []predict.Setting{s}, nil
}

// usesSetting tells whether a pot's setting means anything on this board: its own wiper's does too.
func usesSetting(b sweeps.Board) bool {
	return b.Timing.UsesPot() || b.Timing.Network == sweeps.Wiper
}

func potLike(b sweeps.Board) string {
	if b.Timing.Network == sweeps.Wiper {
		return "0.35"
	}
	return "33k"
}

// potValue reads ohms, or for a wiper network a share of the track.
func potValue(b sweeps.Board, text string) (float64, error) {
	if b.Timing.Network == sweeps.Wiper {
		var x si.Ratio
		err := x.UnmarshalText([]byte(text))
		return x.SI(), err
	}
	var r si.Resistance
	err := r.UnmarshalText([]byte(text))
	return r.SI(), err
}
