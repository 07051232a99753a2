package web

import (
	"context"
	"fmt"
	"net/http"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"nightbench/daemon/store"
	"nightbench/sweeps"
)

// ofBoard is the only board a drawer knows.
var ofBoard = strings.Repeat("0a", 32)

// drawer knows one board, and answers with what it was asked for.
type drawer struct{}

func (drawer) Boards(context.Context) ([]Board, error) {
	return []Board{{Hash: ofBoard, Name: "Dosing pump driver"}}, nil
}

func (drawer) Board(ctx context.Context, hash string, at BoardAsked) (BoardDetail, error) {
	if hash != ofBoard {
		return BoardDetail{}, fmt.Errorf("board %s: %w", hash, store.ErrNotFound)
	}
	if at.Supply > 100 {
		return BoardDetail{}, Fail(Invalid, fmt.Errorf("supply of %g V: too much", at.Supply))
	}
	if _, bounded := ctx.Deadline(); !bounded {
		return BoardDetail{}, fmt.Errorf("it may take for ever")
	}
	pot := at.Pot
	return BoardDetail{
		Board: Board{Hash: hash}, Network: sweeps.Plain, Along: "pot_resistance",
		Setting: BoardSetting{Supply: at.Supply, Pot: &pot, Temperature: at.Temperature}, Values: map[sweeps.Quantity]sweeps.Prediction{},
	}, nil
}

func TestBoardCalls(t *testing.T) {
	h := newHouse(t)
	if bs := into[Boards](h, h.ask("GET", "/api/boards", "", nil)).Boards; len(bs) != 1 || bs[0].Runs == nil || bs[0].Serials == nil {
		t.Errorf("boards %+v", bs)
	}
	pot, amid := 33e3, -1.0
	for query, want := range map[string]BoardSetting{
		"":                                     {Supply: 0, Pot: &amid, Temperature: 27},
		"?supply=9&pot=33000":                  {Supply: 9, Pot: &pot, Temperature: 27},
		"?supply=12&pot=33000&temperature=-10": {Supply: 12, Pot: &pot, Temperature: -10},
	} {
		d := into[BoardDetail](h, h.ask("GET", "/api/boards/"+ofBoard+query, "", nil))
		if diff := cmp.Diff(want, d.Setting); diff != "" || d.Curves == nil || d.Stress == nil || d.Schematic.Parts == nil {
			t.Errorf("%q: %s %+v", query, diff, d)
		}
	}
	for path, status := range map[string]int{
		"/api/boards/" + strings.Repeat("0b", 32):          http.StatusNotFound,
		"/api/boards/pump":                                 http.StatusUnprocessableEntity,
		"/api/boards/" + ofBoard + "?supply=nine":          http.StatusUnprocessableEntity,
		"/api/boards/" + ofBoard + "?supply=400":           http.StatusUnprocessableEntity,
		"/api/boards/" + ofBoard + "?temperature=1000":     http.StatusUnprocessableEntity,
		"/api/boards/" + strings.ToUpper(ofBoard) + "?x=1": http.StatusUnprocessableEntity,
	} {
		if got := h.ask("GET", path, "", nil); got.status != status || got.detail() == "" {
			t.Errorf("%s: %d %s", path, got.status, got.body)
		}
	}
}
