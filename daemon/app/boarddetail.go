package app

import (
	"context"
	"math"

	"nightbench/daemon/web"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
)

// detail is all that is shown of a board, at the setting asked for.
func (l *leaflet) detail(ctx context.Context, of web.Board, asked web.BoardAsked) (web.BoardDetail, error) {
	s, err := l.setting(asked)
	if err != nil {
		return web.BoardDetail{}, web.Fail(web.Invalid, err)
	}
	r, err := l.reach(ctx, s.Temperature)
	if err != nil {
		return web.BoardDetail{}, err
	}
	d := web.BoardDetail{
		Board: of, RatedSupply: [2]float64{l.board.RatedSupply[0].SI(), l.board.RatedSupply[1].SI()}, Network: l.board.Timing.Network, Schematic: l.board.Schematic(),
		Along: l.along(), Curves: r.curves, Oscillation: r.oscillation, Findings: r.findings, Hardest: r.hardest,
		Setting: l.shown(s), Draws: l.ensemble.Size(),
	}
	d.Values, d.Flags = l.ensemble.At(s)
	if err := l.at(&d, s); err != nil {
		return web.BoardDetail{}, web.Fail(web.Invalid, err)
	}
	return d, nil
}

// at adds what is asked of the nominal board at the setting. What a plan would be
// refused for stands among the flags, as the command has it.
func (l *leaflet) at(d *web.BoardDetail, s predict.Setting) error {
	findings, err := l.model.Judge([]predict.Setting{s})
	if err != nil {
		return err
	}
	for _, f := range findings {
		if f.Refuse {
			d.Flags = append(d.Flags, sweeps.Flag{Name: f.Name, Words: "a plan would be refused: " + f.Words})
		}
	}
	if _, swings := d.Values[sweeps.Frequency]; !swings {
		return nil
	}
	all, err := l.model.Sensitivities(s)
	if err != nil {
		return err
	}
	for _, x := range all {
		d.Sensitivities = append(d.Sensitivities, web.BoardSensitivity{Part: x.Part, Unit: x.Unit, Values: x.Values})
	}
	table, err := l.model.Stress(s)
	if err != nil {
		return err
	}
	for i, row := range table.Running {
		d.Stress = append(d.Stress, stressOf(row, table.Locked[i]))
	}
	l.thresholds(d, s)
	return nil
}

// thresholds says where along the pot the motor starts and stalls. Where an end of
// the range does not oscillate there is nothing to bisect, and nothing is said.
func (l *leaflet) thresholds(d *web.BoardDetail, s predict.Setting) {
	if l.board.Load.Kind != sweeps.Motor || !l.hasPot() {
		return
	}
	if t, err := l.model.Thresholds(s, l.pots[0], l.pots[1]); err == nil {
		d.Motor, d.Starts, d.Stalls = t.Words, t.Start, t.Stall
	}
}

// setting fills in what was not asked for. The error is of a setting that cannot be.
func (l *leaflet) setting(asked web.BoardAsked) (predict.Setting, error) {
	s := predict.Setting{Supply: asked.Supply, Pot: asked.Pot, Temperature: asked.Temperature}
	if s.Supply == 0 {
		s.Supply = l.amid
	}
	switch {
	case !l.hasPot() && asked.Pot >= 0:
		return s, errNoSetting
	case !l.hasPot():
		s.Pot = 0
	case asked.Pot < 0:
		s.Pot = l.potAmid()
	}
	_, err := l.model.At(s)
	return s, err
}

// potAmid is the middle of the pot's settings, to two figures.
func (l *leaflet) potAmid() float64 {
	if l.board.Timing.Network == sweeps.Wiper {
		return (l.pots[0] + l.pots[1]) / 2
	}
	x := math.Sqrt(l.pots[0] * l.pots[1])
	unit := math.Pow(10, math.Floor(math.Log10(x))-1)
	return math.Round(x/unit) * unit
}

// shown is a setting as the page has it.
func (l *leaflet) shown(s predict.Setting) web.BoardSetting {
	w := web.BoardSetting{Supply: s.Supply, Temperature: s.Temperature}
	if l.hasPot() {
		w.Pot = &s.Pot
	}
	return w
}
