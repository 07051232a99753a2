package sweeps

import (
	"strconv"
	"time"
)

// State is where a run is in its life.
type State string

// The states: preparing → running ⇄ held, running ⇄ asking, any → making_safe →
// done | stopped | tripped | failed. Interrupted is set only by a later start.
const (
	Preparing   State = "preparing"
	Running     State = "running"
	HeldState   State = "held"
	Asking      State = "asking"
	MakingSafe  State = "making_safe"
	Done        State = "done"
	Stopped     State = "stopped"
	Tripped     State = "tripped"
	Failed      State = "failed"
	Interrupted State = "interrupted"
)

// Ended tells whether a run in this state is over.
func (s State) Ended() bool {
	switch s {
	case Done, Stopped, Tripped, Failed, Interrupted:
		return true
	}
	return false
}

// Run is one execution of a plan on a board on a bench.
type Run struct {
	ID          int64      `json:"id"`
	State       State      `json:"state"`
	Reason      string     `json:"reason"` // why it ended, in words
	Plan        string     `json:"plan"`
	Board       string     `json:"board"`
	Revision    string     `json:"revision"`
	BoardSerial string     `json:"board_serial"`
	Bench       string     `json:"bench"`
	Operator    string     `json:"operator"`
	Note        string     `json:"note"`
	StartedAt   time.Time  `json:"started_at"`
	EndedAt     *time.Time `json:"ended_at,omitempty"`
	Planned     int        `json:"planned"`  // setpoints in the plan
	Measured    int        `json:"measured"` // points in the journal
	Flagged     int        `json:"flagged"`
	Pace        float64    `json:"pace"`
	Seed        Seed       `json:"seed"`
	Version     string     `json:"version"` // of the program
	Quantities  []Quantity `json:"quantities"`
	Files       []File     `json:"files,omitempty"` // bench, board, plan and the board's parts files, verbatim
	Instruments []string   `json:"instruments,omitempty"`
}

// Seed is where a run's random choices begin. It travels as text: JavaScript keeps 53 bits of a number.
type Seed uint64

// MarshalText writes it in decimal.
func (s Seed) MarshalText() ([]byte, error) { return strconv.AppendUint(nil, uint64(s), 10), nil }

// UnmarshalText reads it.
func (s *Seed) UnmarshalText(b []byte) error {
	n, err := strconv.ParseUint(string(b), 10, 64)
	*s = Seed(n)
	return err
}

// File is an input file as it was when the run began.
type File struct {
	Role   string `json:"role"` // "bench", "board", "plan", "parts"
	Name   string `json:"name"`
	SHA256 string `json:"sha256"`
	Text   string `json:"text"`
}
