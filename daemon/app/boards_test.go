package app

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"os"
	"strings"
	"testing"
	"time"

	"nightbench/daemon/store"
	"nightbench/daemon/web"
	"nightbench/sweeps"
	"nightbench/sweeps/example"
	"nightbench/sweeps/predict"

	"github.com/google/go-cmp/cmp"
)

// drawer is runs made of board files, oldest first.
type drawer struct {
	texts []string
	order []sweeps.Setpoint
}

func hashOf(text string) string {
	sum := sha256.Sum256([]byte(text))
	return hex.EncodeToString(sum[:])
}

func (d drawer) BoardFiles(context.Context) (fs []store.BoardFile, _ error) {
	for i := len(d.texts); i > 0; i-- {
		fs = append(fs, store.BoardFile{Run: int64(i), Name: "board.toml", SHA256: hashOf(d.texts[i-1])})
	}
	return fs, nil
}

func (d drawer) Runs(context.Context) (rs []sweeps.Run, _ error) {
	for i := len(d.texts); i > 0; i-- {
		rs = append(rs, sweeps.Run{ID: int64(i), Board: "Dosing pump driver", Revision: "B", BoardSerial: []string{"0017", "0018"}[i%2], StartedAt: time.Unix(int64(i), 0)})
	}
	return rs, nil
}

func (d drawer) Run(_ context.Context, id int64) (sweeps.Run, error) {
	text := d.texts[id-1]
	return sweeps.Run{ID: id, Files: []sweeps.File{{Role: "board", Name: "board.toml", SHA256: hashOf(text), Text: text}}}, nil
}

func (d drawer) Plan(context.Context, int64) ([]sweeps.Setpoint, []sweeps.Curve, error) {
	return d.order, nil, nil
}

func visited(pots ...float64) (order []sweeps.Setpoint) {
	for _, v := range []float64{9, 12} {
		for _, p := range pots {
			order = append(order, sweeps.Setpoint{Supply: v, Pot: p})
		}
	}
	return order
}

func TestBoardsAreThoseOfRuns(t *testing.T) {
	b := newBoards(drawer{texts: []string{"a", "b", "a", "a"}})
	got, err := b.Boards(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	want := []web.Board{
		{Hash: hashOf("a"), Name: "Dosing pump driver", Revision: "B", File: "board.toml", Runs: []int64{4, 3, 1}, Serials: []string{"0017", "0018"}, LastRun: time.Unix(4, 0)},
		{Hash: hashOf("b"), Name: "Dosing pump driver", Revision: "B", File: "board.toml", Runs: []int64{2}, Serials: []string{"0017"}, LastRun: time.Unix(2, 0)},
	}
	if d := cmp.Diff(want, got); d != "" {
		t.Error(d)
	}
}

func TestBoardOfTheExample(t *testing.T) {
	text := example.Text(example.BoardPump)
	b := newBoards(drawer{[]string{text}, visited(1e3, 10e3, 82e3)})
	d, err := b.Board(t.Context(), hashOf(text), web.BoardAsked{Pot: -1, Temperature: 27})
	if err != nil {
		t.Fatal(err)
	}
	if d.Along != "pot_resistance" || d.Setting.Supply != 12 || *d.Setting.Pot != 9100 || d.Draws != 1000 {
		t.Errorf("along %s at %+v of %d", d.Along, d.Setting, d.Draws)
	}
	var supplies []float64
	for _, c := range d.Curves {
		supplies = append(supplies, *c.Supply)
		if len(c.At) != 49 || c.At[0] != 1e3 || c.At[48] != 82e3 || len(c.Quantities[sweeps.Duty].High) != 49 {
			t.Errorf("at %g V: %d points from %g to %g", *c.Supply, len(c.At), c.At[0], c.At[len(c.At)-1])
		}
	}
	if d := cmp.Diff([]float64{7, 9, 12}, supplies); d != "" {
		t.Error(d)
	}
	if o := d.Oscillation; o.Settings != 3*49 || o.Never != 0 || o.Words != "" {
		t.Errorf("oscillation %+v", o)
	}
	if d.Hardest == nil || *d.Hardest.Stress.Rating == 0 || max(*d.Hardest.Stress.HeldShare, *d.Hardest.Stress.RunningShare) > predict.Caution {
		t.Errorf("hardest %+v", d.Hardest)
	}
	for _, f := range d.Findings {
		if f.Name == predict.StressFinding {
			t.Errorf("the example is stressed: %s", f.Words)
		}
	}
	if len(d.Sensitivities) < 10 || len(d.Stress) < 8 || len(d.Schematic.Parts) < 10 || d.Motor == "" {
		t.Errorf("%d sensitivities, %d stresses, %d parts, motor %q", len(d.Sensitivities), len(d.Stress), len(d.Schematic.Parts), d.Motor)
	}
}

// A curve's point is what is predicted at that setting: one and the same board everywhere.
func TestCurvesAgreeWithTheSetting(t *testing.T) {
	text := example.Text(example.BoardPump)
	b := newBoards(drawer{[]string{text}, visited(1e3, 82e3)})
	d, err := b.Board(t.Context(), hashOf(text), web.BoardAsked{Supply: 9, Pot: 82e3, Temperature: 40})
	if err != nil {
		t.Fatal(err)
	}
	for q, p := range d.Values {
		c := d.Curves[1].Quantities[q]
		if *c.Value[48] != p.Value || *c.Low[48] != p.Low || *c.High[48] != p.High {
			t.Errorf("%s: curve %g, setting %g", q, *c.Value[48], p.Value)
		}
	}
}

func TestBoardWithoutAPot(t *testing.T) {
	read, err := os.ReadFile("../../testdata/fixed-duty.board.toml")
	if err != nil {
		t.Fatal(err)
	}
	text := string(read)
	b := newBoards(drawer{[]string{text}, visited(0)})
	d, err := b.Board(t.Context(), hashOf(text), web.BoardAsked{Supply: 9, Pot: -1, Temperature: 27})
	if err != nil {
		t.Fatal(err)
	}
	if d.Along != "supply_voltage" || d.Setting.Pot != nil || len(d.Curves) != 1 || d.Curves[0].Supply != nil || d.Curves[0].At[0] != 5 || d.Curves[0].At[48] != 12 || d.Motor != "" {
		t.Errorf("along %s at %+v, %d curves", d.Along, d.Setting, len(d.Curves))
	}
	var kind web.Kinded
	if _, err := b.Board(t.Context(), hashOf(text), web.BoardAsked{Supply: 9, Pot: 1e3, Temperature: 27}); !errors.As(err, &kind) || kind.Kind() != web.Invalid {
		t.Errorf("a pot it hasn't: %v", err)
	}
}

// A board that does not oscillate over part of its settings says where, and has no sensitivities there.
func TestBoardThatStops(t *testing.T) {
	// 10 M to charge against 5 uA into pin 6: the threshold of two thirds of 9 V is out of reach.
	text := strings.Replace(example.Text(example.BoardPump), `part = "bipolar"`, "part = \"bipolar\"\nthreshold_current = \"5 uA\"", 1)
	text = strings.Replace(strings.Replace(text, `charge = "33k 1%"`, `charge = "pot"`, 1), `discharge = "pot"`, `discharge = "33k 1%"`, 1)
	b := newBoards(drawer{[]string{text}, visited(1e3, 10e6)})
	d, err := b.Board(t.Context(), hashOf(text), web.BoardAsked{Supply: 9, Pot: 10e6, Temperature: 27})
	if err != nil {
		t.Fatal(err)
	}
	if o := d.Oscillation; o.Never == 0 || o.Never == o.Settings || !strings.Contains(o.Words, "never rises") || o.At == nil {
		t.Errorf("oscillation %+v", o)
	}
	if len(d.Sensitivities) != 0 || len(d.Stress) != 0 || len(d.Flags) == 0 || d.Flags[0].Name != predict.NoOscillation {
		t.Errorf("%d sensitivities, flags %+v", len(d.Sensitivities), d.Flags)
	}
	if last := d.Curves[1].Quantities[sweeps.Duty].Value[48]; last != nil {
		t.Errorf("duty of %g where it stands", *last)
	}
}

func TestBoardsNobodyRanAndFilesNobodyReads(t *testing.T) {
	b := newBoards(drawer{texts: []string{"[board]\nname = 3"}})
	for hash, want := range map[string]web.Kind{hashOf("another"): web.NotFound, hashOf("[board]\nname = 3"): web.Invalid} {
		_, err := b.Board(t.Context(), hash, web.BoardAsked{Pot: -1})
		var kind web.Kinded
		if !errors.As(err, &kind) || kind.Kind() != want {
			t.Errorf("want %s, got %v", want, err)
		}
	}
}

// Whoever goes away stops the computing, and whoever waits for it is not kept.
func TestComputingABoardIsBounded(t *testing.T) {
	text := example.Text(example.BoardPump)
	b := newBoards(drawer{[]string{text}, visited(1e3, 82e3)})
	gone, leave := context.WithCancel(t.Context())
	leave()
	if _, err := b.Board(gone, hashOf(text), web.BoardAsked{Pot: -1, Temperature: 27}); !errors.Is(err, context.Canceled) {
		t.Errorf("computed for nobody: %v", err)
	}
	<-b.turn // somebody computes for long
	short, end := context.WithTimeout(t.Context(), 10*time.Millisecond)
	defer end()
	if _, err := b.Board(short, hashOf(text), web.BoardAsked{Pot: -1, Temperature: 27}); !errors.Is(err, context.DeadlineExceeded) {
		t.Errorf("computed beside another: %v", err)
	}
	b.turn <- struct{}{}
}

// countdown is a context that ends after being asked so many times.
type countdown struct {
	context.Context
	left int
}

func (c *countdown) Err() error {
	if c.left--; c.left < 0 {
		return context.Canceled
	}
	return nil
}

// What was finished when the asker went away is there for the next, and counted once.
func TestFinishedCurvesAreKept(t *testing.T) {
	l, err := newLeaflet(sweeps.File{Name: "board.toml", Text: example.Text(example.BoardPump)}, nil, nil, visited(1e3, 82e3))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := l.reach(&countdown{t.Context(), 49 + 10}, 27); !errors.Is(err, context.Canceled) {
		t.Fatalf("went on: %v", err)
	}
	if n := len(l.reaches[27].curves); n != 1 {
		t.Errorf("%d curves kept", n)
	}
	r, err := l.reach(&countdown{t.Context(), 2 * 49}, 27)
	if err != nil || len(r.curves) != 3 || r.oscillation.Settings != 3*49 {
		t.Errorf("%d curves, %v", len(r.curves), err)
	}
}

func TestSuppliesAreThinnedEvenly(t *testing.T) {
	if d := cmp.Diff([]float64{1, 3, 5, 7, 9, 12}, thinned([]float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12}, 6)); d != "" {
		t.Error(d)
	}
}
