package app

import (
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"nightbench/instruments"
)

// Energised is the tiny record that the bench is about to be energised. It names
// all that is needed to switch off without the database or the bench file.
type Energised struct {
	Run      int64     `json:"run"`
	At       time.Time `json:"at"`
	Bench    string    `json:"bench"`
	Address  string    `json:"address"` // of the supply
	Dialect  string    `json:"dialect"`
	Channel  int       `json:"channel"`
	Pace     float64   `json:"pace"`     // of a practice bench: how fast it bleeds down; 1 on a real one
	Practice bool      `json:"practice"` // simulated: it may be gone with the process that simulated it
	Below    float64   `json:"below"`    // V: read back below this the output counts as off
}

// mark keeps the record in a file of the state folder. It is a runner.Mark.
type mark struct {
	path  string
	clock instruments.Clock
	blank Energised // all but run and instant
}

func energisedPath(dir string) string { return filepath.Join(dir, "energised.json") }

// Set writes the record durably.
func (m *mark) Set(run int64) error {
	e := m.blank
	e.Run, e.At = run, m.clock.Now()
	b, err := json.MarshalIndent(e, "", "  ")
	if err != nil {
		return err
	}
	return writeDurably(m.path, append(b, '\n'))
}

// Clear removes it, once off is confirmed.
func (m *mark) Clear() error { return removeDurably(m.path) }

// readEnergised finds the record an earlier daemon left; false when there is none.
func readEnergised(dir string) (Energised, bool, error) {
	b, err := os.ReadFile(energisedPath(dir))
	if errors.Is(err, os.ErrNotExist) {
		return Energised{}, false, nil
	}
	if err != nil {
		return Energised{}, true, fmt.Errorf("energised record: %w", err)
	}
	var e Energised
	if err := json.Unmarshal(b, &e); err != nil || e.Address == "" {
		return Energised{}, true, fmt.Errorf("%s can't be read (%v): switch the supply off by hand, see that it is off, then delete this file", energisedPath(dir), err)
	}
	return e, true, nil
}

// ForgetPractice drops the record of a practice bench that lived in a daemon that
// is gone: its supply, and what it fed, went with it. A record of anything else stays.
func ForgetPractice(dir string) error {
	e, there, err := readEnergised(dir)
	if err != nil || !there || !e.Practice {
		return err
	}
	return removeDurably(energisedPath(dir))
}
