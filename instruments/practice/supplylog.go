package practice

import (
	"encoding/json"
	"io"
	"sync"
	"time"
)

// supplyLog is what the supply was told and when its output was on: a JSON object a line.
type supplyLog struct {
	w     io.Writer
	world *world

	mu   sync.Mutex
	last bool
}

// LogLine is one line of the supply's log.
type LogLine struct {
	At     time.Time `json:"at"`    // wall
	Bench  float64   `json:"bench"` // s of bench time
	Heard  string    `json:"heard,omitempty"`
	Output *bool     `json:"output,omitempty"` // changed to
	Volts  float64   `json:"volts,omitempty"`  // as set
}

func (l *supplyLog) heard(message string) { l.write(LogLine{Heard: message}) }

func (l *supplyLog) output(on bool, volts float64) {
	l.mu.Lock()
	changed := on != l.last
	l.last = on
	l.mu.Unlock()
	if changed {
		l.write(LogLine{Output: &on, Volts: volts})
	}
}

func (l *supplyLog) write(line LogLine) {
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.w == nil {
		return
	}
	line.At, line.Bench = l.world.clock.Now(), l.world.now()
	b, err := json.Marshal(line)
	if err == nil {
		_, err = l.w.Write(append(b, '\n'))
	}
	if err != nil {
		l.w = nil // a log that can't be written is not kept; the supply goes on
	}
}
