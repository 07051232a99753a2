package app

import (
	"crypto/sha256"
	"encoding/base64"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"maps"
	"os"

	"nightbench/instruments/practice"
)

// Truth is what is really on a practice bench: what a night is to find out.
type Truth struct {
	Board       string             `json:"board"`
	Seed        uint64             `json:"seed"`
	Scenario    string             `json:"scenario,omitempty"`
	Parts       map[string]float64 `json:"parts"` // true values by the part's name, SI
	Fitted      map[string]string  `json:"fitted,omitempty"`
	PotTrack    float64            `json:"pot_track"` // Ω, end to end
	Climate     practice.Climate   `json:"climate"`
	Substitutes []Substitute       `json:"substitutes,omitempty"`
	Faults      []Planned          `json:"faults,omitempty"`
}

// sealed is the file: the contents are not to be read by accident, and the seal tells
// whether they are still what was written.
type sealed struct {
	Words    string `json:"words"`
	Seal     string `json:"seal"` // SHA-256 of the contents
	Contents string `json:"contents"`
}

// Seal writes the truth where only those who mean to will read it.
func (t Truth) Seal(path string) error {
	text, err := json.Marshal(t)
	if err != nil {
		return err
	}
	sum := sha256.Sum256(text)
	file, err := json.MarshalIndent(sealed{
		Words: "The true values of the practice board. Open it when you have measured yours: the contents are base64 of JSON.",
		Seal:  hex.EncodeToString(sum[:]), Contents: base64.StdEncoding.EncodeToString(text),
	}, "", "  ")
	if err != nil {
		return err
	}
	return os.WriteFile(path, append(file, '\n'), 0o600)
}

// OpenSealed reads the truth and checks the seal.
func OpenSealed(path string) (t Truth, err error) {
	file, err := os.ReadFile(path)
	if err != nil {
		return t, err
	}
	var s sealed
	if err := json.Unmarshal(file, &s); err != nil {
		return t, fmt.Errorf("%s is no sealed file of a practice board: %w", path, err)
	}
	text, err := base64.StdEncoding.DecodeString(s.Contents)
	if err != nil {
		return t, fmt.Errorf("%s: its contents are damaged: %w", path, err)
	}
	if sum := sha256.Sum256(text); hex.EncodeToString(sum[:]) != s.Seal {
		return t, fmt.Errorf("%s: the seal is broken: its contents were changed after it was written", path)
	}
	return t, json.Unmarshal(text, &t)
}

// truth is what is on the bench of this specimen.
func (s *specimen) truth(o PracticeOptions, track float64, climate practice.Climate) Truth {
	return Truth{
		Board: s.board.Name, Seed: s.seed, Scenario: o.Scenario.Name, Parts: maps.Clone(s.value), Fitted: maps.Clone(s.fitted),
		PotTrack: track, Climate: climate, Substitutes: o.Scenario.Substitutes, Faults: o.Scenario.Faults,
	}
}
