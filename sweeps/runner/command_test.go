package runner

import (
	"strings"
	"testing"

	"nightbench/sweeps"
)

var states = []sweeps.State{sweeps.Preparing, sweeps.Running, sweeps.HeldState, sweeps.Asking, sweeps.MakingSafe,
	sweeps.Done, sweeps.Stopped, sweeps.Tripped, sweeps.Failed, sweeps.Interrupted}

// Every state against every command. A dash is a refusal.
var wanted = map[Command]string{
	//           preparing   running     held        asking      making_safe  ended ×5
	CmdHold:     "-           held        -           -           -            - - - - -",
	CmdContinue: "-           -           running     -           -            - - - - -",
	CmdStop:     "making_safe making_safe making_safe making_safe making_safe  - - - - -",
	CmdOff:      "making_safe making_safe making_safe making_safe making_safe  - - - - -",
}

func TestStateAndCommand(t *testing.T) {
	if len(wanted) != len(Commands) {
		t.Fatal("a command is missing in the table")
	}
	for _, c := range Commands {
		for i, word := range strings.Fields(wanted[c]) {
			s := states[i]
			got, err := After(s, c)
			switch {
			case word == "-" && (err == nil || got != s):
				t.Errorf("%s while %s: leads to %s", c, s, got)
			case word == "-" && !strings.HasPrefix(err.Error(), string(c)+":"):
				t.Errorf("%s while %s: refused in other words: %q", c, s, err)
			case word == "-" && s.Ended() != strings.Contains(err.Error(), "is over"):
				t.Errorf("%s while %s: %q", c, s, err)
			case word != "-" && (err != nil || string(got) != word):
				t.Errorf("%s while %s: leads to %s, %v; want %s", c, s, got, err, word)
			}
		}
	}
}

// What a state allows goes through Command too, and what is done to the run is only that.
func TestCommandObeysTheTable(t *testing.T) {
	for _, s := range states {
		for _, c := range Commands {
			r := New(Options{})
			r.state = s
			_, refused := After(s, c)
			err := r.Command(c, "Ada")
			if (err == nil) != (refused == nil) {
				t.Errorf("%s while %s: %v, by the table %v", c, s, err, refused)
			}
			ends := r.life.Err() != nil
			if want := refused == nil && (c == CmdStop || c == CmdOff); ends != want {
				t.Errorf("%s while %s ends the run: %v", c, s, ends)
			}
			if got, want := r.holding(), refused == nil && c == CmdHold; got != want {
				t.Errorf("%s while %s asks for a hold: %v", c, s, got)
			}
			r.cancel(nil)
		}
	}
}

// While the bench is made safe nothing but an end follows, whatever a conductor that comes late says.
func TestNoWayBackFromMakingSafe(t *testing.T) {
	r := New(Options{})
	r.enter(sweeps.MakingSafe)
	for _, s := range states {
		if got := r.enter(s); got != s.Ended() {
			t.Errorf("from making safe to %s: %v", s, got)
		}
		r.state = sweeps.MakingSafe
	}
}

// The first cause stays, whatever follows from it.
func TestFirstCauseStays(t *testing.T) {
	r := New(Options{})
	r.cancel(&Trip{Reason: "first"})
	r.cancel(&Stop{Reason: "second"})
	if err := r.Command(CmdStop, "Ada"); err != nil {
		t.Fatal(err)
	}
	<-r.life.Done()
	if end := ending(causeOf(r)); end.State != sweeps.Tripped || end.Reason != "first" {
		t.Errorf("%+v", end)
	}
}
