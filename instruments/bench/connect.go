package bench

import (
	"context"

	"nightbench/instruments/dialect"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
)

// Connect opens the link to one instrument that need be on no bench, as its
// dialect wants it (nil: the usual settings), and says no word to it. Close
// the link when done.
func Connect(ctx context.Context, a link.Address, d *dialect.Dialect, o Options) (*link.Link, *scpi.Conn, error) {
	i := &instrument{slot: slot{port: Port{Address: a}, d: d}}
	if err := i.dial(ctx, o); err != nil {
		return nil, nil, err
	}
	return i.link, i.conn, nil
}

// WithUsualLine adds a dialect's serial settings to an address that gives none.
func WithUsualLine(a link.Address, d *dialect.Dialect) (link.Address, error) {
	return withLine(a, d.Link.Line)
}
