package link

import (
	"cmp"
	"context"
	"io"
	"time"
)

// Dial opens the stream behind an address.
type Dial func(ctx context.Context, a Address) (io.ReadWriteCloser, error)

// Options say how a link talks. The zero value of each field means its
// default.
type Options struct {
	// Dial replaces the real opening; a test passes one end of
	// a net.Pipe or a playback.
	Dial Dial
	// Terminator ends each line sent; default NL.
	Terminator string
	// ReplyEnd is the byte that ends a reply line; default NL. Bytes of CR,
	// NL, NUL and space around the line are dropped whatever it is, so CR NL
	// and NL CR talkers need no setting.
	ReplyEnd byte
	// Timeout bounds one reply line, and the gap between the bytes of a
	// block; default 5 s. A context that ends earlier wins.
	Timeout time.Duration
	// WriteTimeout bounds the handing over of one line; default 2 s.
	WriteTimeout time.Duration
	// ReplyLimit is the longest reply line in bytes; default 1 MiB.
	ReplyLimit int
	// Quiet is how long the instrument must be silent to count as drained;
	// default 100 ms, a hundred characters at 9600 bit/s.
	Quiet time.Duration
	// ClearLimit bounds Clear as a whole; default 5 s.
	ClearLimit time.Duration
	// ClearBytes are sent before draining, where the instrument has a
	// device clear of its own, such as the byte 0x03.
	ClearBytes []byte
	// ClearBreak sends a break before draining, which is the device clear of
	// some serial families; other links ignore it.
	ClearBreak bool
	// ClearReply is what an instrument says when its device clear is done,
	// such as DCL; draining then waits for it. usbtmc and hislip ignore it.
	ClearReply string
	// Trace, when set, sees every byte that is received or about to be sent. It is called from the
	// link's own goroutines, possibly two at once, and must be quick.
	Trace func(Event)
	// Now stamps events; default time.Now.
	Now func() time.Time
}

// Direction tells sent bytes from received ones.
type Direction byte

// The two directions.
const (
	Out Direction = '>'
	In  Direction = '<'
)

// Event is some bytes passing the link. Data must not be changed or kept.
type Event struct {
	Time time.Time
	Dir  Direction
	Data []byte
}

// withDefaults fills what was left out.
func (o Options) withDefaults() Options {
	if o.Dial == nil {
		o.Dial = DialAddress
	}
	if o.Now == nil {
		o.Now = time.Now
	}
	o.Terminator = cmp.Or(o.Terminator, "\n")
	o.ReplyEnd = cmp.Or(o.ReplyEnd, '\n')
	o.Timeout = cmp.Or(o.Timeout, 5*time.Second)
	o.WriteTimeout = cmp.Or(o.WriteTimeout, 2*time.Second)
	o.ReplyLimit = cmp.Or(o.ReplyLimit, 1<<20)
	o.Quiet = cmp.Or(o.Quiet, 100*time.Millisecond)
	o.ClearLimit = cmp.Or(o.ClearLimit, 5*time.Second)
	return o
}
