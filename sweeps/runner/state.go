package runner

import (
	"fmt"

	"nightbench/sweeps"
)

// Command is what a person may ask of a run.
type Command string

// The commands.
const (
	CmdHold     Command = "hold"
	CmdContinue Command = "continue"
	CmdStop     Command = "stop"
	CmdOff      Command = "off"
)

// Commands lists every command.
var Commands = []Command{CmdHold, CmdContinue, CmdStop, CmdOff}

// table says what a command leads to in each state. A pair that is missing is refused.
var table = map[sweeps.State]map[Command]sweeps.State{
	sweeps.Preparing:  {CmdStop: sweeps.MakingSafe, CmdOff: sweeps.MakingSafe},
	sweeps.Running:    {CmdStop: sweeps.MakingSafe, CmdOff: sweeps.MakingSafe, CmdHold: sweeps.HeldState},
	sweeps.HeldState:  {CmdStop: sweeps.MakingSafe, CmdOff: sweeps.MakingSafe, CmdContinue: sweeps.Running},
	sweeps.Asking:     {CmdStop: sweeps.MakingSafe, CmdOff: sweeps.MakingSafe},
	sweeps.MakingSafe: {CmdStop: sweeps.MakingSafe, CmdOff: sweeps.MakingSafe},
}

// After is the state a command leads to; an error in words where it is refused.
func After(s sweeps.State, c Command) (sweeps.State, error) {
	if next, ok := table[s][c]; ok {
		return next, nil
	}
	switch {
	case s.Ended():
		return s, fmt.Errorf("%s: the run is over (%s)", c, s)
	case c == CmdHold:
		return s, fmt.Errorf("hold: the run is %s; only a running one can be held", words(s))
	case c == CmdContinue:
		return s, fmt.Errorf("continue: the run is %s; only a held one can go on", words(s))
	}
	return s, fmt.Errorf("%s: not possible while the run is %s", c, words(s))
}

// said is what the log says when a run comes to a state.
var said = map[sweeps.State]string{
	sweeps.Preparing:  "Preparing: limits set and read back, output off.",
	sweeps.Running:    "Running.",
	sweeps.HeldState:  "Held: output off.",
	sweeps.Asking:     "Waiting for a person.",
	sweeps.MakingSafe: "Making the bench safe.",
}

func words(s sweeps.State) string {
	switch s {
	case sweeps.MakingSafe:
		return "making safe"
	case sweeps.Asking:
		return "asking a person"
	}
	return string(s)
}

// Command asks the run for something; by names who asks. Refusals are errors in words.
func (r *Runner) Command(c Command, by string) error {
	r.mu.Lock()
	_, err := After(r.state, c)
	r.mu.Unlock()
	if err != nil {
		return err
	}
	switch c {
	case CmdStop:
		r.cancel(&Stop{Reason: "stopped by " + by})
	case CmdOff:
		r.cancel(&Stop{Reason: "outputs off, by " + by})
	case CmdHold:
		offer(r.hold)
	case CmdContinue:
		offer(r.goOn)
	}
	return nil
}

// offer puts a token into a one-slot channel unless one is there.
func offer(c chan struct{}) {
	select {
	case c <- struct{}{}:
	default:
	}
}

// State is where the run is.
func (r *Runner) State() sweeps.State {
	r.mu.Lock()
	defer r.mu.Unlock()
	return r.state
}

// enter moves the run on. Once it is being made safe, only an end follows.
func (r *Runner) enter(s sweeps.State) (entered bool) {
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.state == sweeps.MakingSafe && !s.Ended() {
		return false
	}
	r.state, r.vitals.State = s, s
	return true
}

// setState moves the run on and writes it to the journal.
func (r *Runner) setState(s sweeps.State) {
	if !r.enter(s) {
		return
	}
	if _, err := r.append(sweeps.Entry{Kind: sweeps.KindState, State: s, Words: said[s]}); err != nil {
		r.cancel(&journalFailed{err})
	}
	r.changed()
}
