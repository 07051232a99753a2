package scpi

import (
	"context"
	"fmt"

	"nightbench/instruments/link"
)

// Reply is an answer of either shape.
type Reply struct {
	Text  string // the line; empty for a block
	Block []byte // nil for a line
}

// QueryAny asks what may be answered by a line or by a block of at most so
// many bytes, and finds out by its first two bytes: # and a digit begin a
// block, # and a letter a number that is not decimal.
func (c *Conn) QueryAny(ctx context.Context, query string, most int) (r Reply, err error) {
	if err := checkMessage(query, true); err != nil {
		return r, err
	}
	err = c.exchange(ctx, query, func(t *link.Turn) (string, error) {
		head, err := t.Peek(ctx, 2)
		if err != nil && len(head) == 0 {
			return "", err
		}
		if len(head) == 2 && head[0] == '#' && head[1] >= '0' && head[1] <= '9' {
			r.Block, err = c.readBlock(ctx, t, BlockForm{}, most)
			return fmt.Sprintf("block of %d bytes", len(r.Block)), err
		}
		r.Text, err = t.ReadLine(ctx)
		return r.Text, err
	})
	if err != nil {
		return Reply{}, err
	}
	return r, nil
}
