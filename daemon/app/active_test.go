package app

import (
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

func TestNobodyAttendingNeedsACutoff(t *testing.T) {
	real, practice := instruments.Wiring{}, instruments.Wiring{Practice: true}
	noon := time.Date(2026, 12, 1, 12, 0, 0, 0, time.Local)
	const says = `attended = "AK until 18:00"`
	for name, c := range map[string]struct {
		attended string
		wiring   instruments.Wiring
		cutoff   instruments.Cutoff
		unproven []string
		until    string // "15:04"; empty: nobody has to
		refused  string // part of the refusal; empty: none
	}{
		"nobody":                {"", real, instruments.NoCutoff, nil, "", says},
		"without an hour":       {"AK", real, instruments.NoCutoff, nil, "", says},
		"the hour has passed":   {"AK until 11:00", real, instruments.NoCutoff, nil, "", "11:00 has passed"},
		"no such hour":          {"AK until 25:00", real, instruments.NoCutoff, nil, "", "25:00"},
		"attended":              {"AK until 18:00", real, instruments.NoCutoff, nil, "18:00", ""},
		"practice bench":        {"", practice, instruments.NoCutoff, nil, "", ""},
		"with a cutoff":         {"", real, fedCutoff{}, nil, "", ""},
		"unproven lines":        {"", real, fedCutoff{}, []string{"output", "off"}, "", "unchecked lines for output, off"},
		"unproven and somebody": {"AK until 13:30", real, fedCutoff{}, []string{"off"}, "13:30", ""},
	} {
		until, err := attendance(sweeps.Plan{Path: "night.toml", Attended: c.attended}, c.wiring, c.cutoff, c.unproven, noon)
		switch {
		case c.refused == "" && err != nil, c.refused != "" && (err == nil || !strings.Contains(err.Error(), c.refused)):
			t.Errorf("%s: %v, want %q", name, err, c.refused)
		case c.refused == "" && c.until == "" && !until.IsZero(), c.until != "" && until.Format("15:04") != c.until:
			t.Errorf("%s: until %v, want %q", name, until, c.until)
		}
	}
}

type fedCutoff struct{ instruments.Cutoff }

func TestSafeByIsTheNextTimeTheClockShowsIt(t *testing.T) {
	night := time.Date(2026, 12, 1, 22, 0, 0, 0, time.Local)
	for text, want := range map[string]time.Time{
		"07:00": time.Date(2026, 12, 2, 7, 0, 0, 0, time.Local),
		"23:30": time.Date(2026, 12, 1, 23, 30, 0, 0, time.Local),
		"22:00": time.Date(2026, 12, 2, 22, 0, 0, 0, time.Local),
		"":      {},
	} {
		if got, err := safeBy(text, night); err != nil || !got.Equal(want) {
			t.Errorf("safe by %q: got %v, %v; want %v", text, got, err, want)
		}
	}
	if _, err := safeBy("7 o'clock", night); err == nil {
		t.Error("an unreadable time passed")
	}
}

func TestOnlyLoopbackIsServed(t *testing.T) {
	for _, ok := range []string{"127.0.0.1:0", "localhost:8017", "[::1]:0"} {
		if err := nearby(ok); err != nil {
			t.Errorf("%s: %v", ok, err)
		}
	}
	for _, far := range []string{"0.0.0.0:0", ":8017", "192.0.2.1:80", "bench.example:80", "8017"} {
		if nearby(far) == nil {
			t.Errorf("%s is not loopback and passed", far)
		}
	}
}

func TestRehearsalSeesATripBelowThePrediction(t *testing.T) {
	all := []Rehearsed{
		{Setpoint: sweeps.Setpoint{Supply: 9, Pot: 1e3}, Predictions: map[sweeps.Quantity]sweeps.Prediction{sweeps.MotorCurrent: {High: 0.079, Unit: "A"}}},
		{Setpoint: sweeps.Setpoint{Supply: 9, Pot: 50e3}, Predictions: map[sweeps.Quantity]sweeps.Prediction{sweeps.MotorCurrent: {High: 0.06, Unit: "A"}}},
	}
	found := tripsTooLow([]sweeps.Trip{{Quantity: sweeps.MotorCurrent, Limit: 0.07}, {Quantity: sweeps.SupplyCurrent, Limit: 0.01}}, all)
	if len(found) != 1 || found[0].Count != 1 || found[0].Setting.Pot != 1e3 || !strings.Contains(found[0].Words, "79") {
		t.Errorf("found %+v", found)
	}
	if found := tripsTooLow([]sweeps.Trip{{Quantity: sweeps.MotorCurrent, Limit: 0.8}}, all); len(found) != 0 {
		t.Errorf("a high limit is no finding: %+v", found)
	}
}
