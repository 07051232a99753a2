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
	if err := unattended(sweeps.Plan{Path: "night.toml"}, real, instruments.NoCutoff, nil); err == nil || !strings.Contains(err.Error(), `attended = "AK until 18:00"`) {
		t.Errorf("an unattended start on a bench without a cutoff: %v", err)
	}
	for name, err := range map[string]error{
		"attended":       unattended(sweeps.Plan{Attended: "AK until 18:00"}, real, instruments.NoCutoff, []string{"off"}),
		"practice bench": unattended(sweeps.Plan{}, practice, instruments.NoCutoff, nil),
		"with a cutoff":  unattended(sweeps.Plan{}, real, fedCutoff{}, nil),
	} {
		if err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// A supply whose output-off, read-back or protection is from memory is not left alone, whatever cutoff there is.
func TestNobodyAttendingNeedsCheckedGuards(t *testing.T) {
	err := unattended(sweeps.Plan{Path: "night.toml"}, instruments.Wiring{}, fedCutoff{}, []string{"output", "over_voltage_tripped"})
	if err == nil {
		t.Fatal("an unattended start with unchecked guards passed")
	}
	for _, want := range []string{"night.toml", "output, over_voltage_tripped", "unchecked", `attended = "AK until 18:00"`} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%q does not say %q", err, want)
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
