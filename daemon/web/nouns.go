package web

import (
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// Status is what a page shows around everything else.
type Status struct {
	Version    string        `json:"version"`
	Practice   bool          `json:"practice" doc:"The instruments are simulated."`
	Pace       float64       `json:"pace" doc:"Bench seconds a wall second; 1 on a real bench."`
	Bench      string        `json:"bench"`
	MayControl bool          `json:"may_control" doc:"Whether this caller may command the bench."`
	Vitals     sweeps.Vitals `json:"vitals"`
	Cautions   []string      `json:"cautions"`
	StartedAt  time.Time     `json:"started_at" doc:"Of the daemon."`
}

// Runs lists runs, newest first, without their files.
type Runs struct {
	Runs []sweeps.Run `json:"runs"`
}

// RunDetail is a run with its files, the order of visit and the prediction drawn when it began.
type RunDetail struct {
	Run       sweeps.Run        `json:"run"`
	Setpoints []sweeps.Setpoint `json:"setpoints"`
	Curves    []sweeps.Curve    `json:"curves"`
}

// Points are a run's points in the order measured.
type Points struct {
	Points []sweeps.Point `json:"points"`
}

// Log is a run's entries but for points, oldest first.
type Log struct {
	Entries []sweeps.Entry `json:"entries"`
}

// Waveforms are the raw records kept with one point.
type Waveforms struct {
	Point   int             `json:"point" doc:"The setpoint's index."`
	At      time.Time       `json:"at"`
	Records []sweeps.Record `json:"records"`
}

// Bench is the wiring and who answers at its addresses.
type Bench struct {
	Wiring      instruments.Wiring `json:"wiring"`
	Instruments []Instrument       `json:"instruments"`
}

// Instrument is one instrument of the bench as it introduced itself.
type Instrument struct {
	Name     string               `json:"name"`
	Role     string               `json:"role" doc:"supply, meter, scope, pot or cutoff"`
	Address  string               `json:"address"`
	Identity instruments.Identity `json:"identity"`
	Dialect  string               `json:"dialect"`
}

// StartRequest asks for a run.
type StartRequest struct {
	Plan        string `json:"plan" minLength:"1" doc:"The plan file's absolute path, on the daemon's computer."`
	BoardSerial string `json:"board_serial,omitempty"`
	Operator    string `json:"operator,omitempty"`
	Note        string `json:"note,omitempty"`
}

// ResumeRequest asks for an interrupted run to go on.
type ResumeRequest struct {
	Operator string `json:"operator,omitempty"`
}

// StopRequest says why a run is to end, and who asks.
type StopRequest struct {
	Reason string `json:"reason,omitempty"`
	By     string `json:"by,omitempty"`
}

// ByRequest says who asks.
type ByRequest struct {
	By string `json:"by,omitempty"`
}

// Nothing is an empty answer: it was done.
type Nothing struct{}

// Hello is the first message a watcher sends on the stream. A browser can't
// set headers on a websocket, so its token comes here; empty may watch on loopback.
type Hello struct {
	Token string `json:"token"`
}

// EntryMessage is one entry of the journal, in order of seq.
type EntryMessage struct {
	Kind  string       `json:"kind" enum:"entry"`
	Entry sweeps.Entry `json:"entry"`
}

// VitalsMessage is the newest vitals. Older ones that were not sent are gone for good.
type VitalsMessage struct {
	Kind   string        `json:"kind" enum:"vitals"`
	Vitals sweeps.Vitals `json:"vitals"`
}

// CaughtUpMessage comes once, when the replay has reached the tail as it was when the watcher came.
type CaughtUpMessage struct {
	Kind string `json:"kind" enum:"caught_up"`
	Seq  int64  `json:"seq" doc:"Of the newest entry sent, or where the watcher asked to begin."`
}
