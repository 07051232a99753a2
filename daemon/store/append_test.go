package store

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"nightbench/sweeps"
)

// TestReplayIsWhatWasAnnounced: every entry read from the store is the very entry Append answered.
func TestReplayIsWhatWasAnnounced(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	v := 0.02
	curve := sweeps.Curve{Supply: 9, Pot: []float64{1e3, 1e5}, Quantities: map[sweeps.Quantity]sweeps.CurveOfQuantity{
		sweeps.Duty: {Unit: "1", Value: []*float64{&v, nil}, Low: []*float64{&v, nil}, High: []*float64{&v, nil}}}}
	announced := []sweeps.Entry{
		mustAppend(t, s, sweeps.Entry{Kind: sweeps.KindLog, Words: "found the bench safe"}),
		mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindStarted, Words: "run began", Curves: []sweeps.Curve{curve}, Setpoints: []sweeps.Setpoint{{Index: 0, Supply: 9}, {Index: 1, Supply: 9, Recheck: true}}}),
		mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindState, State: sweeps.Running, Elapsed: 1.5}),
		mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(0), Elapsed: 12.5}),
		mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(1), Elapsed: 25}),
		mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindOff, Off: &sweeps.Off{Confirmed: true, By: []string{"supply"}, Voltage: &v, Below: 0.5, At: time.Unix(9, 0).UTC()}}),
		mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Done, Words: "every setpoint measured"}),
	}
	for i := range announced {
		if announced[i].Point != nil {
			announced[i].Point.Records = nil // read one by one
		}
	}
	got, err := s.Entries(t.Context(), 0, 100)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(announced, got); d != "" {
		t.Error(d)
	}
	for i, limit := 0, 2; i < len(got); i += limit { // page by page gives the same
		page, err := s.Entries(t.Context(), int64(i), limit)
		if d := cmp.Diff(got[i:min(i+limit, len(got))], page); d != "" || err != nil {
			t.Error(err, d)
		}
	}
}

func TestRunFollowsItsEntries(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindState, State: sweeps.Running})
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(0)})
	clean := samplePoint(1)
	clean.Readings = clean.Readings[:2]
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: clean})

	open, is, err := s.OpenRun(t.Context())
	if err != nil || !is || open.State != sweeps.Running || open.Measured != 2 || open.Flagged != 1 || open.Seed != run.Seed {
		t.Errorf("open run: %+v %v %v", open, is, err)
	}
	if d := cmp.Diff(run.Files, open.Files); d != "" {
		t.Error(d)
	}
	e := mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Tripped, Words: "motor current above 0.8 A for 200 ms"})
	r, err := s.Run(t.Context(), run.ID)
	if err != nil || r.State != sweeps.Tripped || r.Reason != e.Words || r.EndedAt == nil || !r.EndedAt.Equal(e.At) {
		t.Errorf("ended run: %+v %v", r, err)
	}
	if _, is, _ := s.OpenRun(t.Context()); is {
		t.Error("an ended run is open")
	}
	if runs, err := s.Runs(t.Context()); err != nil || len(runs) != 1 || runs[0].Files != nil {
		t.Errorf("runs: %+v %v", runs, err)
	}
}

// TestInterruptedRunGoesOn: a resumed run is open again, and keeps its points.
func TestInterruptedRunGoesOn(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(0)})
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Interrupted, Words: "the computer stopped"})
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindState, State: sweeps.Preparing})
	r, is, err := s.OpenRun(t.Context())
	if err != nil || !is || r.ID != run.ID || r.EndedAt != nil || r.Reason != "" || r.Measured != 1 {
		t.Errorf("%+v %v %v", r, is, err)
	}
	if _, err := s.Append(t.Context(), sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(0)}); !errors.Is(err, ErrDuplicate) {
		t.Errorf("measured twice: %v", err)
	}
}

func TestOneOpenRun(t *testing.T) {
	s := openStore(t)
	first := mustRun(t, s)
	if _, err := s.CreateRun(t.Context(), sampleRun()); !errors.Is(err, ErrRunOpen) || !strings.Contains(err.Error(), "run 1 is preparing") {
		t.Errorf("second run: %v", err)
	}
	mustAppend(t, s, sweeps.Entry{Run: first.ID, Kind: sweeps.KindEnded, State: sweeps.Stopped})
	second := mustRun(t, s)
	if second.ID != first.ID+1 {
		t.Errorf("run %d after %d", second.ID, first.ID)
	}
	if _, err := s.Append(t.Context(), sweeps.Entry{Run: first.ID, Kind: sweeps.KindState, State: sweeps.Preparing}); !errors.Is(err, ErrRunOpen) {
		t.Errorf("reopened beside an open run: %v", err)
	}
	if _, err := s.write.Exec(`UPDATE run SET state = 'running', ended_at = NULL`); !isTwice(err) {
		t.Errorf("the index let two runs be open: %v", err)
	}
}

// TestDuplicateLeavesNothing: a refused point takes its entry, its readings and its count with it, and no number of the journal.
func TestDuplicateLeavesNothing(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	e := mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(7)})
	if _, err := s.Append(t.Context(), sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(7)}); !errors.Is(err, ErrDuplicate) {
		t.Fatalf("got %v", err)
	}
	var n int
	if err := s.read.QueryRow(`SELECT (SELECT count(*) FROM reading) + (SELECT count(*) FROM entry) + (SELECT measured FROM run)`).Scan(&n); err != nil || n != 4+1+1 {
		t.Errorf("%d rows and counts, want 6 (%v)", n, err)
	}
	if next := mustAppend(t, s, sweeps.Entry{Kind: sweeps.KindLog}); next.Seq != e.Seq+1 {
		t.Errorf("seq went from %d to %d", e.Seq, next.Seq)
	}
}

func TestSeqIsNeverReused(t *testing.T) {
	s := openStore(t)
	e := mustAppend(t, s, sweeps.Entry{Kind: sweeps.KindLog})
	if _, err := s.write.Exec(`DELETE FROM entry`); err != nil {
		t.Fatal(err)
	}
	if next := mustAppend(t, s, sweeps.Entry{Kind: sweeps.KindLog}); next.Seq <= e.Seq {
		t.Errorf("seq %d came again", next.Seq)
	}
}

func TestRefused(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	reading := func(change func(*sweeps.Reading)) sweeps.Entry {
		p := samplePoint(0)
		change(&p.Readings[0])
		return sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: p}
	}
	value := func(v float64) sweeps.Entry { return reading(func(r *sweeps.Reading) { r.Value = &v }) }
	u := func(v float64) sweeps.Entry { return reading(func(r *sweeps.Reading) { r.U = &v }) }
	point := func(change func(*sweeps.Point)) sweeps.Entry {
		p := samplePoint(0)
		change(p)
		return sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: p}
	}
	cases := map[string]sweeps.Entry{
		"overload as a value":      value(9.9e37), // SCPI-1999 vol. 1, 7.2.1.4: infinity
		"not-a-number as a value":  value(9.91e37),
		"just at the limit":        value(-1e30),
		"NaN":                      value(math.NaN()),
		"infinite":                 value(math.Inf(-1)),
		"u is NaN":                 u(math.NaN()),
		"u is negative":            u(-1e-9),
		"value without u":          reading(func(r *sweeps.Reading) { r.U = nil }),
		"u without value":          reading(func(r *sweeps.Reading) { r.Value = nil }),
		"neither, and no flag":     reading(func(r *sweeps.Reading) { r.Value, r.U = nil, nil }),
		"no degrees of freedom":    reading(func(r *sweeps.Reading) { r.DOF = new(float64) }),
		"another unit":             reading(func(r *sweeps.Reading) { r.Unit = "V" }),
		"unknown quantity":         reading(func(r *sweeps.Reading) { r.Quantity = "loudness" }),
		"same quantity, same road": point(func(p *sweeps.Point) { p.Readings[2] = p.Readings[1] }),
		"supply NaN":               point(func(p *sweeps.Point) { p.Setpoint.Supply = math.NaN() }),
		"negative setpoint":        point(func(p *sweeps.Point) { p.Setpoint.Index = -1 }),
		"prediction upside down": point(func(p *sweeps.Point) {
			p.Predictions[sweeps.Duty] = sweeps.Prediction{Value: 1, Low: 2, High: 1, Unit: "1"}
		}),
		"prediction NaN":            point(func(p *sweeps.Point) { p.Predictions[sweeps.Duty] = sweeps.Prediction{Value: math.NaN(), Unit: "1"} }),
		"waveform without interval": point(func(p *sweeps.Point) { p.Records[0].Interval = 0 }),
		"point without a run":       {Kind: sweeps.KindPoint, Point: samplePoint(0)},
		"point entry, no point":     {Run: run.ID, Kind: sweeps.KindPoint},
		"ended, but how?":           {Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Running},
		"state of no run":           {Kind: sweeps.KindState, State: sweeps.Running},
		"unknown kind":              {Run: run.ID, Kind: "gossip"},
		"unknown state":             {Run: run.ID, Kind: sweeps.KindState, State: "asleep"},
		"elapsed NaN":               {Kind: sweeps.KindLog, Elapsed: math.NaN()},
	}
	for name, e := range cases {
		if _, err := s.Append(t.Context(), e); !errors.Is(err, ErrRefused) {
			t.Errorf("%s: got %v, want ErrRefused", name, err)
		}
	}
	if _, err := s.Append(t.Context(), sweeps.Entry{Run: 99, Kind: sweeps.KindLog}); !errors.Is(err, ErrNotFound) {
		t.Errorf("unknown run: %v", err)
	}
	if last, err := s.Last(t.Context()); err != nil || last != 0 {
		t.Errorf("%d entries stand (%v)", last, err)
	}
}

// TestTablesRefuseToo: the checks stand in the tables as well, for whoever writes there by hand.
func TestTablesRefuseToo(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(0)})
	for _, set := range []string{
		`UPDATE reading SET value = 9.9e37 WHERE position = 0`, `UPDATE reading SET u = NULL WHERE position = 0`, `UPDATE reading SET value = NULL WHERE position = 0`,
		`UPDATE reading SET flags = '[]' WHERE value IS NULL`, `UPDATE reading SET value = 'much' WHERE position = 0`, `UPDATE reading SET point = 99`,
		`UPDATE run SET state = 'done'`, `UPDATE run SET started_at = 'yesterday'`, `UPDATE entry SET run = 99`, `UPDATE entry SET point = NULL`, `UPDATE record SET codes = x'00'`,
		`INSERT INTO point SELECT NULL, run, setpoint, supply_voltage, pot_code, pot_resistance, direction, pass, recheck, at, elapsed, flags FROM point`,
	} {
		if _, err := s.write.Exec(set); err == nil {
			t.Errorf("accepted: %s", set)
		}
	}
}

func TestPointIntoAnEndedRun(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Stopped})
	if _, err := s.Append(t.Context(), sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(0)}); !errors.Is(err, ErrRefused) {
		t.Errorf("got %v", err)
	}
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindLog, Words: "a note in the morning"})
}

// TestCancelledMeansNothingWritten: an append whose context has ended changes nothing, and says why it ended.
func TestCancelledMeansNothingWritten(t *testing.T) {
	s := openStore(t)
	tripped := errors.New("motor current too high")
	ctx, cancel := context.WithCancelCause(t.Context())
	cancel(tripped)
	if _, err := s.Append(ctx, sweeps.Entry{Kind: sweeps.KindLog}); !errors.Is(err, tripped) {
		t.Errorf("got %v", err)
	}
	if last, _ := s.Last(t.Context()); last != 0 {
		t.Error("something was written")
	}
}

func TestPlanLogAndRecords(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	setpoints := []sweeps.Setpoint{{Index: 0, Supply: 5, Pot: 1e3}, {Index: 1, Supply: 5, Pot: 2e3}}
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindStarted, Words: "run began", Setpoints: setpoints, Curves: []sweeps.Curve{{Supply: 5, Pot: []float64{}}}})
	plain := samplePoint(1)
	plain.Records = nil
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(0)})
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: plain})

	got, curves, err := s.Plan(t.Context(), run.ID)
	if d := cmp.Diff(setpoints, got); d != "" || len(curves) != 1 || err != nil {
		t.Error(d, curves, err)
	}
	if log, err := s.Log(t.Context(), run.ID); err != nil || len(log) != 1 || log[0].Words != "run began" || log[0].Curves != nil {
		t.Errorf("log: %+v %v", log, err)
	}
	if p, err := s.NewestRecord(t.Context(), run.ID); err != nil || p.Setpoint.Index != 0 || cmp.Diff(samplePoint(0).Records, p.Records) != "" {
		t.Errorf("newest record: %+v %v", p, err)
	}
	if rs, err := s.Records(t.Context(), run.ID, 1); err != nil || len(rs) != 0 {
		t.Errorf("a point that kept none: %v %v", rs, err)
	}
	if _, err := s.Records(t.Context(), run.ID, 2); !errors.Is(err, ErrNotFound) {
		t.Errorf("a setpoint not measured: %v", err)
	}
	if _, err := s.Run(t.Context(), 99); !errors.Is(err, ErrNotFound) {
		t.Errorf("run 99: %v", err)
	}
	if _, err := s.RunStart(t.Context(), 99); !errors.Is(err, ErrNotFound) {
		t.Errorf("start of run 99: %v", err)
	}
	if seq, err := s.RunStart(t.Context(), run.ID); err != nil || seq != 1 {
		t.Errorf("start: %d %v", seq, err)
	}
}
