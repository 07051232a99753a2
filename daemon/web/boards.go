package web

import (
	"context"
	"time"

	"github.com/danielgtaylor/huma/v2"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// Predictor knows the boards that runs were made of and computes what their
// schematics give. Both may be called at once from several requests.
type Predictor interface {
	// Boards are those of all runs, the most recently run first.
	Boards(ctx context.Context) ([]Board, error)
	// Board computes one at a setting. It gives up when ctx ends.
	Board(ctx context.Context, hash string, at BoardAsked) (BoardDetail, error)
}

// BoardAsked is where a board is to be computed.
type BoardAsked struct {
	Supply      float64 // V; 0: one of the newest run's
	Pot         float64 // Ω, or a share of the track; below 0: amid what the newest run visits
	Temperature float64 // °C
}

// Board is a board file as runs keep copies of it. Files that differ in any
// character are different boards.
type Board struct {
	Hash     string    `json:"hash" doc:"SHA-256 of the file."`
	Name     string    `json:"name"`
	Revision string    `json:"revision"`
	File     string    `json:"file" doc:"The file's name when the newest run began."`
	Runs     []int64   `json:"runs" doc:"Made of it, newest first."`
	Serials  []string  `json:"serials" doc:"Of the specimens, as given when the runs were started."`
	LastRun  time.Time `json:"last_run"`
}

// Boards lists boards, the most recently run first.
type Boards struct {
	Boards []Board `json:"boards"`
}

// BoardSetting is a supply voltage, where the pot stands, and the temperature.
type BoardSetting struct {
	Supply      float64  `json:"supply_voltage"`
	Pot         *float64 `json:"pot,omitempty" doc:"In ohms, or the share of the track in the charging path, as along says; left out where there is none."`
	Temperature float64  `json:"temperature" doc:"Of the surroundings, in degrees Celsius."`
}

// BoardDetail is one board: its drawing, and what is predicted of it.
type BoardDetail struct {
	Board       Board            `json:"board"`
	RatedSupply [2]float64       `json:"rated_supply" doc:"Lowest and highest, in volts."`
	Network     sweeps.Network   `json:"network" doc:"Of the timing: plain, bypassed, steered, wiper or output-fed."`
	Schematic   sweeps.Schematic `json:"schematic"`

	Along       string           `json:"along" enum:"pot_resistance,pot_position,supply_voltage" doc:"What the curves run along."`
	Curves      []BoardCurve     `json:"curves"`
	Oscillation BoardOscillation `json:"oscillation"`
	Findings    []BoardFinding   `json:"findings" doc:"What a plan over the curves' settings would be cautioned or refused for."`
	Hardest     *BoardHardest    `json:"hardest,omitempty" doc:"The greatest share of a rating over the curves' settings."`

	Setting       BoardSetting                          `json:"setting" doc:"Of all that follows."`
	Values        map[sweeps.Quantity]sweeps.Prediction `json:"values"`
	Flags         []sweeps.Flag                         `json:"flags"`
	Sensitivities []BoardSensitivity                    `json:"sensitivities" doc:"None where the board does not oscillate."`
	Stress        []BoardStress                         `json:"stress" doc:"None where the board does not oscillate."`
	Motor         string                                `json:"motor,omitempty" doc:"Where along the pot it starts and stalls, in words."`
	Starts        *float64                              `json:"starts,omitempty" doc:"The pot's setting at which the motor just starts from rest."`
	Stalls        *float64                              `json:"stalls,omitempty" doc:"The pot's setting at which it just goes on running."`
	Draws         int                                   `json:"draws" doc:"Boards drawn within tolerance for the bands."`
}

// BoardCurve is every quantity along the pot at one supply voltage, or along the supply.
type BoardCurve struct {
	Supply     *float64                                   `json:"supply_voltage,omitempty" doc:"Left out where the curve runs along it."`
	At         []float64                                  `json:"at"`
	Quantities map[sweeps.Quantity]sweeps.CurveOfQuantity `json:"quantities"`
}

// BoardOscillation tells whether the board swings over the curves' settings.
type BoardOscillation struct {
	Settings int           `json:"settings" doc:"Looked at."`
	Never    int           `json:"never" doc:"Of those, where the board of nominal parts does not oscillate."`
	Doubtful int           `json:"doubtful" doc:"And where it does but some boards within tolerance do not."`
	Words    string        `json:"words,omitempty" doc:"Of the first such setting."`
	At       *BoardSetting `json:"at,omitempty"`
}

// BoardFinding is something to say before a plan starts.
type BoardFinding struct {
	Name    string       `json:"name"`
	Refuse  bool         `json:"refuse" doc:"A plan would be refused; otherwise a caution."`
	Words   string       `json:"words"`
	Setting BoardSetting `json:"setting" doc:"The worst."`
	Count   int          `json:"count" doc:"Settings it concerns."`
}

// BoardSensitivity is what one percent of a part makes of each quantity, in percent.
type BoardSensitivity struct {
	Part   string                      `json:"part"`
	Unit   si.Unit                     `json:"unit"`
	Values map[sweeps.Quantity]float64 `json:"values"`
}

// BoardStress is one part's load against its rating.
type BoardStress struct {
	Part         string   `json:"part"`
	What         string   `json:"what"`
	Unit         si.Unit  `json:"unit"`
	Running      float64  `json:"running"`
	Held         float64  `json:"held" doc:"With the rotor held; the same for a load that does not turn."`
	Rating       *float64 `json:"rating,omitempty" doc:"Left out where none is known."`
	RunningShare *float64 `json:"running_share,omitempty" doc:"Of the rating."`
	HeldShare    *float64 `json:"held_share,omitempty"`
}

// BoardHardest is the stress nearest to its rating, and where.
type BoardHardest struct {
	Stress  BoardStress  `json:"stress"`
	Held    bool         `json:"held" doc:"The rotor held is the harder case."`
	Setting BoardSetting `json:"setting"`
}

// boardInput is the input of the call about one board.
type boardInput struct {
	Hash        string  `path:"hash" pattern:"^[0-9a-f]{64}$" doc:"The board file's SHA-256."`
	Supply      float64 `query:"supply" default:"0" minimum:"0" doc:"Volts; left out or 0: one of the newest run's."`
	Pot         float64 `query:"pot" default:"-1" minimum:"-1" doc:"Ohms, or the share of the track in the charging path; left out: amid what the newest run visits."`
	Temperature float64 `query:"temperature" default:"27" minimum:"-100" maximum:"200" doc:"Degrees Celsius."`
}

// boardLimit bounds the computing of one answer.
const boardLimit = 30 * time.Second

func (s *Server) boardCalls(api huma.API) {
	get(s, api, "boards", "/api/boards", "Boards that runs were made of", func(ctx context.Context, _ *none) (Boards, error) {
		bs, err := s.o.Predict.Boards(ctx)
		for i := range bs {
			bs[i] = tidyBoard(bs[i])
		}
		return Boards{orEmpty(bs)}, err
	})
	get(s, api, "board", "/api/boards/{hash}", "One board: schematic, predicted curves, sensitivities, stress", s.board)
}

func (s *Server) board(ctx context.Context, in *boardInput) (BoardDetail, error) {
	ctx, cancel := context.WithTimeout(ctx, boardLimit)
	defer cancel()
	d, err := s.o.Predict.Board(ctx, in.Hash, BoardAsked{Supply: in.Supply, Pot: in.Pot, Temperature: in.Temperature})
	d.Board = tidyBoard(d.Board)
	d.Schematic.Nodes, d.Schematic.Parts = orEmpty(d.Schematic.Nodes), orEmpty(d.Schematic.Parts)
	d.Curves, d.Findings, d.Flags = orEmpty(d.Curves), orEmpty(d.Findings), orEmpty(d.Flags)
	d.Sensitivities, d.Stress = orEmpty(d.Sensitivities), orEmpty(d.Stress)
	return d, err
}

func tidyBoard(b Board) Board {
	b.Runs, b.Serials = orEmpty(b.Runs), orEmpty(b.Serials)
	return b
}
