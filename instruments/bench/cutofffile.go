package bench

import (
	"context"

	"nightbench/instruments/dialect"
	"nightbench/instruments/driver"
	"nightbench/instruments/userfile"
)

// cutoff reads [cutoff].
func (r *reader) cutoff(t *userfile.Table) {
	if !t.Present() {
		return
	}
	p := r.port(t)
	r.out.Cutoff = &p
}

func (b *Opened) cutoffSlot(p Port, o Options) slot {
	return slot{name: "cutoff", role: dialect.RoleCutoff, port: p,
		make: func(ctx context.Context, i *instrument) ([]string, error) {
			c, notes, err := driver.OpenCutoff(ctx, i.conn, i.d, i.options(o))
			if err == nil {
				b.Cutoff, i.stop = c, c.Close
			}
			return notes, err
		}}
}
