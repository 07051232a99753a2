package sweeps

import (
	"time"

	"nightbench/instruments"
)

// Kind says what a journal entry is about.
type Kind string

// The kinds of entry. Every entry has Words for the margin of the page, save points, whose words the page makes.
const (
	KindStarted    Kind = "started"    // a run began; Curves hold the prediction for the whole plan, Setpoints the order of visit
	KindState      Kind = "state"      // State changed
	KindEnergising Kind = "energising" // about to energise: durable before the output goes on
	KindOff        Kind = "off"        // Off says whether confirmed, and by whom
	KindPoint      Kind = "point"      // a point was measured
	KindLog        Kind = "log"        // anything else worth a sentence
	KindTrip       Kind = "trip"       // a limit was passed: reason and raw reading
	KindEnded      Kind = "ended"      // the run is over; State says how
)

// Entry is one line of the journal. Seq is global over all runs, given by the store, never reused; the stream is the tail of the journal.
type Entry struct {
	Seq     int64     `json:"seq"`
	Run     int64     `json:"run"` // 0: no run (found energised at start, for instance)
	At      time.Time `json:"at"`
	Elapsed float64   `json:"elapsed"` // s of bench time since the run began
	Kind    Kind      `json:"kind"`
	Words   string    `json:"words,omitempty"`

	State     State      `json:"state,omitempty"`
	Point     *Point     `json:"point,omitempty"`
	Curves    []Curve    `json:"curves,omitempty"`
	Setpoints []Setpoint `json:"setpoints,omitempty"`
	Off       *Off       `json:"off,omitempty"`
}

// Off is the outcome of making the bench safe. Confirmed means that a voltage was read back below Below.
type Off struct {
	Confirmed bool      `json:"confirmed"`
	By        []string  `json:"by"`      // witnesses: "supply", "meter average"
	Voltage   *float64  `json:"voltage"` // V, last read
	Below     float64   `json:"below"`   // V
	At        time.Time `json:"at"`
	Words     string    `json:"words"` // unconfirmed: which switch to turn by hand
}

// OffFrom is a report of making safe as the journal keeps it.
func OffFrom(r instruments.OffReport) Off {
	by := r.By
	if by == nil {
		by = []string{}
	}
	return Off{Confirmed: r.Confirmed, By: by, Voltage: r.Voltage, Below: r.Below, At: r.At, Words: r.Words}
}

// Energised is what is known of the output: "yes", "no" or "unconfirmed".
type Energised string

// The three answers.
const (
	EnergisedYes         Energised = "yes"
	EnergisedNo          Energised = "no"
	EnergisedUnconfirmed Energised = "unconfirmed"
)

// Vitals is the latest of what changes all the time. Volatile and unnumbered: only the newest counts.
type Vitals struct {
	At          time.Time   `json:"at"`
	Energised   Energised   `json:"energised"`
	Since       *time.Time  `json:"since,omitempty"` // output on since, or off confirmed at
	ConfirmedBy []string    `json:"confirmed_by,omitempty"`
	Voltage     *float64    `json:"supply_voltage,omitempty"` // V, latest
	Current     *float64    `json:"supply_current,omitempty"` // A, latest
	VoltageU    *float64    `json:"supply_voltage_u,omitempty"`
	CurrentU    *float64    `json:"supply_current_u,omitempty"`
	ReadAt      *time.Time  `json:"read_at,omitempty"`
	Run         int64       `json:"run"` // the open run, 0: none
	State       State       `json:"state,omitempty"`
	Doing       string      `json:"doing"`  // headline: "Settling at 9 V, 22 k; 3 of 8 repeats"
	Detail      string      `json:"detail"` // second sentence
	Setpoint    *Setpoint   `json:"setpoint,omitempty"`
	Repeat      int         `json:"repeat"`
	Repeats     int         `json:"repeats"`
	Planned     int         `json:"planned"`
	Measured    int         `json:"measured"`
	Flagged     int         `json:"flagged"`
	TimeLeft    *float64    `json:"time_left,omitempty"` // s of wall time
	SafeBy      *time.Time  `json:"safe_by,omitempty"`   // wall time
	Instruments []Answering `json:"instruments"`
	Watchers    int         `json:"watchers"`
}

// Answering is one line about an instrument: "answers in 31 ms".
type Answering struct {
	Name  string `json:"name"`
	Words string `json:"words"`
}
