package link

import (
	"context"
	"time"
)

// What a stream may be able to do besides carrying bytes. A serial line and a
// socket carry bytes whenever they come; usbtmc and hislip carry messages with
// an end, and have a device clear beside the stream.

// expecter is a stream that is silent until a reply is asked for: reading
// without need would itself be an error to the instrument (-420).
type expecter interface {
	// Expect lets one reply come, within d. While one is expected it does nothing.
	Expect(d time.Duration)
}

// clearer is a stream with a device clear of its own. When Clear is back
// without an error no reply to an earlier question can come.
type clearer interface {
	Clear(ctx context.Context) error
}

// breaker is a serial line: Break holds it at space for about a quarter of a second.
type breaker interface {
	Break() error
}

// expect lets a reply come, where the stream waits to be asked.
func (t *Turn) expect() {
	if w := t.l.wire.Load(); w != nil {
		if e, ok := w.rw.(expecter); ok {
			e.Expect(t.Timeout)
		}
	}
}
