package bench

import (
	"fmt"
	"strings"
	"testing"
	"testing/synctest"
)

// failure is a row of the failure matrix: what goes wrong, who provokes it,
// what is required of this program, and the test that holds it to that.
type failure struct {
	number   int
	what     string
	by       string // the practice bench on real ports, or an instrument of the test's own
	required string
	test     func(t *testing.T)
}

const (
	practiceBench = "practice bench"
	ownPeer       = "own instrument"
)

// After any of them the next reading is right or refused. The numbers are
// those of the makers' and the trade's failures listed for a robust client;
// what is required is common practice, no source.
var failures = []failure{
	{1, "USB cable pulled", practiceBench, "lost at once; no command that changes an output is repeated; back under its name it is asked who it is", unplugged},
	{2, "port has another number after plugging in", practiceBench, "found by the name that stays; the old name says what to use", renumbered},
	{3, "two instruments swapped", ownPeer, "refused, both named", bubble(swapped)},
	{4, "late reply after a time-out", ownPeer, "never given to the next question", bubble(lateReply)},
	{5, "query with a wrong header has no reply", ownPeer, "time-out and error queue told together", bubble(unknownHeader)},
	{6, "reply never read", ownPeer, "every query is written and read in one turn", bubble(everyReplyRead)},
	{7, "block cut short", ownPeer, "fails with got and expected; no part is used", bubble(truncatedBlock)},
	{8, "wrong block count, or no #", ownPeer, "fails; the next record is right", bubble(wrongCount)},
	{9, "NL inside binary data", practiceBench, "count decides, not NL; raw terminal; no block over XON/XOFF", newlineInBlock},
	{10, "mixed terminators", ownPeer, "CR, CR NL, NL CR, NL NL and blanks are dropped round a reply", bubble(terminators)},
	{11, "echo", ownPeer, "noticed at opening; a dialect may state it", bubble(echoes)},
	{12, "baud rate, parity or stop bits wrong", ownPeer, "refused at opening, with the settings tried", bubble(wrongBaud)},
	{13, "no hardware handshake", ownPeer, "short commands, one at a time, each awaited", bubble(smallBuffer)},
	{14, "panel locked, or in local", ownPeer, "refused with the instrument's own error", bubble(panelLocked)},
	{15, "somebody turns a knob at the front panel", ownPeer, "settings are read back before each reading; refused when they differ", bubble(turnedAtThePanel)},
	{16, "error queue full", practiceBench, "drained, bounded; -350 told as errors unknown", queueFull},
	{17, "error query never empty", ownPeer, "given up after its depth; 0, +0 and 0 No Error are empty", bubble(endlessQueue)},
	{18, "setting silently clipped", ownPeer, "read back; refused when it differs", bubble(clipped)},
	{19, "over-voltage protection tripped", practiceBench, "seen in the state; never cleared by itself", tripped},
	{20, "supply in current limit", ownPeer, "told as a result beside voltage and current", bubble(limiting)},
	{21, "overload number 9.9E37", ownPeer, "an outcome, never a number", bubble(overload)},
	{22, "no measurement: 9.91E37 or a word", ownPeer, "an outcome, or refused", bubble(noMeasurement)},
	{23, "stale value", ownPeer, "a new reading or record each time", bubble(stale)},
	{24, "slow reading, longer than the time-out", ownPeer, "aperture, auto-zero and ranging are allowed for", bubble(slowReading)},
	{25, "reading taken before the source settled", ownPeer, "measured only once it holds still; else flagged", bubble(unsettled)},
	{26, "*OPC? answers 0 while busy, or is missing", ownPeer, "polled until done, as the dialect says", bubble(polledCompletion)},
	{27, "single shot never triggers", ownPeer, "own deadline; an untriggered record, called so", bubble(noTrigger)},
	{28, "another client talks to it too", practiceBench, "exclusive lock; replies nobody asked for are never used", otherClient},
	{29, "power cycle leaves TCP half open", practiceBench, "deadline; settings read back before the next reading", powerCycle},
	{30, "messages merged or split by TCP", ownPeer, "ends and counts decide, not packets", splitPackets},
	{31, "too slow for back-to-back commands", ownPeer, "the dialect's gap is kept", bubble(slowParser)},
	{32, "decimal comma, or a unit in the reply", ownPeer, "refused, unless the dialect states the unit", bubble(commaAndUnit)},
	{33, "reply header on", ownPeer, "refused, or taken off where the dialect states it", bubble(replyHeader)},
	{34, "probe factor differs", ownPeer, "set, read back, refused when it differs", bubble(probeFactor)},
	{35, "program killed with the output on", ownPeer, "found on; off is the first word; confirmed by reading back", bubble(killed)},
}

// bubble runs a test on a clock that jumps over waiting.
func bubble(test func(t *testing.T)) func(t *testing.T) {
	return func(t *testing.T) { synctest.Test(t, test) }
}

// TestFailureMatrix provokes every row and prints the matrix (go test -v).
func TestFailureMatrix(t *testing.T) {
	var table strings.Builder
	fmt.Fprintf(&table, "| # | failure | provoked by | required | held |\n|---|---|---|---|---|\n")
	for n, f := range failures {
		if f.number != n+1 {
			t.Errorf("row %d stands at place %d", f.number, n+1)
		}
		held := t.Run(fmt.Sprintf("%02d %s", f.number, f.what), f.test)
		fmt.Fprintf(&table, "| %d | %s | %s | %s | %s |\n", f.number, f.what, f.by, f.required, map[bool]string{true: "yes", false: "NO"}[held])
	}
	if len(failures) != 35 {
		t.Errorf("%d rows, want 35", len(failures))
	}
	t.Log("\n" + table.String())
}
