package app

import (
	"context"
	"errors"
	"fmt"
	"slices"

	"nightbench/daemon/store"
	"nightbench/daemon/web"
	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
)

// BandSeed and BandDraws are how a band is drawn where nobody asks for another:
// the command predict and the page draw the same boards.
const (
	BandSeed  = 1
	BandDraws = draws
)

// drawers is what the boards of past runs are read from.
type drawers interface {
	BoardFiles(ctx context.Context) ([]store.BoardFile, error)
	Runs(ctx context.Context) ([]sweeps.Run, error)
	Run(ctx context.Context, id int64) (sweeps.Run, error)
	Plan(ctx context.Context, run int64) ([]sweeps.Setpoint, []sweeps.Curve, error)
}

// boards predicts for the boards that runs were made of, from the runs' own
// copies of the files. Parts are taken at the file's values, the pot as exact, no
// meter in the motor's loop: as the command predict takes them.
type boards struct {
	from drawers
	turn chan struct{}       // holds one token: who computes; a run under way needs the processors too
	kept map[string]*leaflet // by hash; only who holds the token looks
}

// Boards and settings kept computed.
const (
	boardsKept  = 8
	reachesKept = 8
)

func newBoards(from drawers) *boards {
	b := &boards{from: from, turn: make(chan struct{}, 1), kept: map[string]*leaflet{}}
	b.turn <- struct{}{}
	return b
}

// Boards are those of all runs, the most recently run first.
func (b *boards) Boards(ctx context.Context) ([]web.Board, error) {
	files, err := b.from.BoardFiles(ctx)
	if err != nil {
		return nil, err
	}
	runs, err := b.from.Runs(ctx)
	if err != nil {
		return nil, err
	}
	of := map[int64]sweeps.Run{}
	for _, r := range runs {
		of[r.ID] = r
	}
	all, at := []web.Board{}, map[string]int{}
	for _, f := range files {
		r := of[f.Run]
		i, seen := at[f.SHA256]
		if !seen {
			i = len(all)
			at[f.SHA256] = i
			all = append(all, web.Board{Hash: f.SHA256, Name: r.Board, Revision: r.Revision, File: f.Name, LastRun: r.StartedAt, Serials: []string{}})
		}
		all[i].Runs = append(all[i].Runs, f.Run)
		if s := r.BoardSerial; s != "" && !slices.Contains(all[i].Serials, s) {
			all[i].Serials = append(all[i].Serials, s)
		}
	}
	return all, nil
}

// Board computes one at a setting.
func (b *boards) Board(ctx context.Context, hash string, asked web.BoardAsked) (web.BoardDetail, error) {
	all, err := b.Boards(ctx)
	if err != nil {
		return web.BoardDetail{}, err
	}
	i := slices.IndexFunc(all, func(x web.Board) bool { return x.Hash == hash })
	if i < 0 {
		return web.BoardDetail{}, web.Fail(web.NotFound, fmt.Errorf("board %.12s…: no run was made of a file with this SHA-256; see the list of boards", hash))
	}
	select {
	case <-b.turn:
		defer func() { b.turn <- struct{}{} }()
	case <-ctx.Done():
		return web.BoardDetail{}, fmt.Errorf("board %.12s…: another board is being computed: %w", hash, ctx.Err())
	}
	l, err := b.leaflet(ctx, all[i])
	if err != nil {
		return web.BoardDetail{}, err
	}
	return l.detail(ctx, all[i], asked)
}

// leaflet is a board read and drawn, from the newest run's copy.
func (b *boards) leaflet(ctx context.Context, of web.Board) (*leaflet, error) {
	if l := b.kept[of.Hash]; l != nil && l.run == of.Runs[0] {
		return l, nil
	}
	run, err := b.from.Run(ctx, of.Runs[0])
	if err != nil {
		return nil, err
	}
	order, _, err := b.from.Plan(ctx, run.ID)
	if err != nil {
		return nil, err
	}
	i := slices.IndexFunc(run.Files, func(f sweeps.File) bool { return f.Role == "board" && f.SHA256 == of.Hash })
	if i < 0 {
		return nil, fmt.Errorf("run %d: its board file is gone", run.ID)
	}
	l, err := newLeaflet(run.Files[i], sweeps.PartsOf(run.Files), wiringOf(run), order)
	if err != nil {
		return nil, web.Fail(web.Invalid, fmt.Errorf("run %d's copy of its board file: %w", run.ID, err))
	}
	if len(b.kept) >= boardsKept {
		clear(b.kept)
	}
	l.run = run.ID
	b.kept[of.Hash] = l
	return l, nil
}

// wiringOf is a run's own copy of its bench file; nil where it kept none that can be read.
func wiringOf(run sweeps.Run) *instruments.Wiring {
	for _, f := range run.Files {
		if f.Role != "bench" {
			continue
		}
		if b, err := bench.Parse(f.Name, f.Text); err == nil {
			return &b.Wiring
		}
	}
	return nil
}

// leaflet is one board with what was computed of it so far.
type leaflet struct {
	run      int64
	board    sweeps.Board
	model    *predict.Model
	ensemble *predict.Ensemble
	supplies []float64  // V, rising: the rated ends, and between them those of the run
	amid     float64    // V, of the run's
	pots     [2]float64 // Ω or share: from, to; equal where there is no pot
	reaches  map[float64]*reach
}

// suppliesDrawn bounds how many curves are drawn: beyond, figures are full and computing is slow.
const suppliesDrawn = 6

func newLeaflet(file sweeps.File, parts []sweeps.File, w *instruments.Wiring, order []sweeps.Setpoint) (*leaflet, error) {
	board, err := sweeps.ParseBoard(file, parts...)
	if err != nil {
		return nil, err
	}
	m, err := predict.New(board, AloneOptions(board, w))
	if err != nil {
		return nil, err
	}
	l := &leaflet{board: board, model: m, ensemble: m.Draw(BandDraws, BandSeed), reaches: map[float64]*reach{}}
	run := suppliesOf(order)
	ends := []float64{board.RatedSupply[0].SI(), board.RatedSupply[1].SI()}
	l.supplies = thinned(rising(append(ends, run...)), suppliesDrawn)
	if len(run) == 0 {
		run = l.supplies
	}
	l.amid = run[len(run)/2]
	l.pots = potsOf(board, order)
	return l, nil
}

// along is what a board's curves run along.
func (l *leaflet) along() string {
	switch {
	case l.board.Timing.Network == sweeps.Wiper:
		return "pot_position"
	case l.board.Timing.UsesPot():
		return "pot_resistance"
	}
	return "supply_voltage"
}

func (l *leaflet) hasPot() bool { return l.along() != "supply_voltage" }

func suppliesOf(order []sweeps.Setpoint) []float64 {
	var all []float64
	for _, s := range order {
		all = append(all, s.Supply)
	}
	return rising(all)
}

func rising(all []float64) []float64 {
	slices.Sort(all)
	return slices.Compact(all)
}

// thinned keeps both ends and at most n evenly chosen.
func thinned(all []float64, n int) []float64 {
	if len(all) <= n {
		return all
	}
	kept := make([]float64, n)
	for i := range kept {
		kept[i] = all[i*(len(all)-1)/(n-1)]
	}
	return kept
}

// Where no run says how far the pot goes: nearly from end to end of a track, and
// the decades a timing pot has in common practice, no source.
var (
	wholeTrack = [2]float64{0.02, 0.98}
	usualPot   = [2]float64{1e3, 1e5}
)

// potsOf is from the least to the greatest setting of the pot that the run visits.
func potsOf(b sweeps.Board, order []sweeps.Setpoint) [2]float64 {
	switch {
	case b.Timing.Network == sweeps.Wiper:
		return wholeTrack
	case !b.Timing.UsesPot():
		return [2]float64{}
	}
	var ends [2]float64
	for _, s := range order {
		if s.Pot <= 0 {
			continue
		}
		if ends[0] == 0 {
			ends = [2]float64{s.Pot, s.Pot}
		}
		ends = [2]float64{min(ends[0], s.Pot), max(ends[1], s.Pot)}
	}
	switch {
	case ends[0] == 0:
		return usualPot
	case ends[0] == ends[1]:
		return [2]float64{ends[0] / 10, ends[0] * 10}
	}
	return ends
}

var errNoSetting = errors.New("this board has no pot: leave the pot out")
