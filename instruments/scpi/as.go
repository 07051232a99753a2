package scpi

import "context"

// QueryAs is Query for a reply that parse must accept. A reply it refuses puts
// the step in doubt, since it may be the answer to something else.
func (c *Conn) QueryAs(ctx context.Context, query string, parse func(reply string) error) error {
	return c.queryAs(ctx, query, parse)
}
