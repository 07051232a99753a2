package scpi

import (
	"cmp"
	"time"
)

// Options say how one instrument family behaves as far as messages go. The
// zero value of a field means its default, which is the standard's.
type Options struct {
	// Identity is the reply to the identity query that must come back; empty
	// when it is not known yet, then the first one is remembered.
	Identity string
	// IdentityQuery; default *IDN?.
	IdentityQuery string
	// Marker is a second query whose reply is known beforehand; default
	// *OPC? with the reply 1.
	Marker Marker
	// NoMarker says that there is no such query. The identity alone is then
	// the proof of being in step, and that no late reply passes for it rests
	// on the quiet before and after, not on counting: weaker.
	NoMarker bool
	// ErrorQuery; default SYST:ERR?. ErrorDepth is how many errors the queue
	// can hold; default 30.
	ErrorQuery string
	ErrorDepth int
	// Numbers says what a numeric reply may look like besides the standard's.
	Numbers NumberForm
	// Bools are the words of a boolean reply in capitals; default 0, 1, OFF, ON.
	Bools map[string]bool
	// Echo says that each line sent comes back before the reply.
	Echo bool
	// Gap is the shortest time between the end of one exchange and the start
	// of the next.
	Gap time.Duration
	// BlockLead is text that may stand before the # of a block.
	BlockLead string
	// ResyncLimit bounds the regaining of step as a whole; default 20 s.
	ResyncLimit time.Duration
	// OnExchange, when set, sees every exchange when it has ended, also those
	// that regain step. It is called while the link is held, so it must be
	// quick and not use the Conn; and for Blind perhaps at the same time from
	// another goroutine.
	OnExchange func(Exchange)
	// Now stamps exchanges; default time.Now.
	Now func() time.Time
}

// Marker is a query whose right replies are known beforehand.
type Marker struct {
	Query   string
	Replies []string
}

// Exchange is one command and its reply, for logs and figures of latency.
type Exchange struct {
	Start   time.Time
	Elapsed time.Duration
	Command string
	Reply   string // text, or the size of a block in words
	Err     error
	// Strays is what was waiting before the question: replies to questions
	// not asked.
	Strays string
	// Proof marks the exchanges that regain step.
	Proof bool
}

func (o Options) withDefaults() Options {
	o.IdentityQuery = cmp.Or(o.IdentityQuery, "*IDN?")
	if o.Marker.Query == "" {
		o.Marker = Marker{Query: "*OPC?", Replies: []string{"1", "+1"}}
	}
	o.ErrorQuery = cmp.Or(o.ErrorQuery, "SYST:ERR?")
	o.ErrorDepth = cmp.Or(o.ErrorDepth, 30)
	o.ResyncLimit = cmp.Or(o.ResyncLimit, 20*time.Second)
	if o.Bools == nil {
		o.Bools = map[string]bool{"0": false, "1": true, "OFF": false, "ON": true}
	}
	if o.Now == nil {
		o.Now = time.Now
	}
	return o
}
