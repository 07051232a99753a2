package main

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"syscall"
	"testing"

	"nightbench/daemon/web"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
)

// told is what predict --json prints.
type told struct {
	Quantities    map[sweeps.Quantity]sweeps.Prediction `json:"quantities"`
	Flags         []sweeps.Flag                         `json:"flags"`
	Sensitivities []predict.Sensitivity                 `json:"sensitivities"`
	Stress        predict.StressTable                   `json:"stress"`
}

// worst keeps the largest relative difference seen.
type worst struct{ most float64 }

func (w *worst) see(t *testing.T, what string, page, command float64) {
	t.Helper()
	d := math.Abs(page - command)
	if command != 0 {
		d /= math.Abs(command)
	}
	w.most = max(w.most, d)
	if !(d <= 1e-12) {
		t.Errorf("%s: the page has %g, the command %g", what, page, command)
	}
}

// TestBoardsAgreeWithPredict asks the daemon for the board of its run, and the
// command for the same file and setting, each in a process of its own.
func TestBoardsAgreeWithPredict(t *testing.T) {
	state := filepath.Join(t.TempDir(), "state")
	demo := start(t, "demo", "--pace", "100", "--listen", "127.0.0.1:0", "--state", state)
	demo.until("#token=")
	eventually(t, "a run", func() bool { return len(get[web.Boards](t, state, "/api/boards").Boards) == 1 })
	of := get[web.Boards](t, state, "/api/boards").Boards[0]
	dir := t.TempDir()
	file := filepath.Join(dir, of.File)
	for _, f := range get[web.RunDetail](t, state, fmt.Sprintf("/api/runs/%d", of.Runs[0])).Run.Files {
		name := f.Name
		if f.Role == "bench" {
			name = "bench.toml" // what its pot bears
		}
		if err := os.WriteFile(filepath.Join(dir, name), []byte(f.Text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	var w worst
	for _, s := range []struct {
		supply, pot string
		temperature int
	}{{"9", "33000", 27}, {"12", "1000", 27}, {"7", "82000", 45}} {
		page := get[web.BoardDetail](t, state, fmt.Sprintf("/api/boards/%s?supply=%s&pot=%s&temperature=%d", of.Hash, s.supply, s.pot, s.temperature))
		out, status := once(t, "predict", file, "--supply", s.supply+"V", "--pot", s.pot, "--temperature", fmt.Sprintf("%d degC", s.temperature), "--sensitivities", "--stress", "--json")
		var command told
		if err := json.Unmarshal([]byte(out), &command); err != nil || status != 0 {
			t.Fatalf("predict: status %d, %v:\n%s", status, err, out)
		}
		agree(t, &w, page, command)
		if !slices.ContainsFunc(command.Stress.Running, func(s predict.Stress) bool { return s.Part == "pot" && s.Rating == 2.5e-3 }) {
			t.Errorf("the pot's rating is not known: %+v", command.Stress.Running)
		}
	}
	t.Logf("largest relative difference %g", w.most)
	demo.signal(syscall.SIGINT)
	demo.end()
}

func agree(t *testing.T, w *worst, page web.BoardDetail, command told) {
	t.Helper()
	at := fmt.Sprintf("at %g V", page.Setting.Supply)
	if len(page.Values) != len(command.Quantities) || len(page.Sensitivities) != len(command.Sensitivities) || len(page.Stress) != len(command.Stress.Running) || len(page.Flags) != len(command.Flags) {
		t.Fatalf("%s: %d values, %d sensitivities, %d stresses, %d flags; the command has %d, %d, %d, %d", at, len(page.Values), len(page.Sensitivities), len(page.Stress), len(page.Flags),
			len(command.Quantities), len(command.Sensitivities), len(command.Stress.Running), len(command.Flags))
	}
	for q, p := range command.Quantities {
		have := page.Values[q]
		w.see(t, fmt.Sprintf("%s, %s", at, q), have.Value, p.Value)
		w.see(t, fmt.Sprintf("%s, %s, low", at, q), have.Low, p.Low)
		w.see(t, fmt.Sprintf("%s, %s, high", at, q), have.High, p.High)
	}
	for i, s := range command.Sensitivities {
		for q, x := range s.Values {
			w.see(t, fmt.Sprintf("%s, %s of %s", at, q, s.Part), page.Sensitivities[i].Values[q], x)
		}
	}
	for i, s := range command.Stress.Running {
		have := page.Stress[i]
		if have.Part != s.Part || have.What != s.What {
			t.Errorf("%s: %s, %s stands where the command has %s, %s", at, have.Part, have.What, s.Part, s.What)
		}
		w.see(t, s.String(), have.Running, s.Value)
		w.see(t, s.String()+", rotor held", have.Held, command.Stress.Locked[i].Value)
		if share := s.Share(); share > 0 {
			w.see(t, s.String()+", share", *have.RunningShare, share)
		}
	}
	for i, f := range command.Flags {
		if page.Flags[i] != f {
			t.Errorf("%s: flag %+v, the command has %+v", at, page.Flags[i], f)
		}
	}
}
