package bench

import (
	"context"
	"errors"
	"fmt"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver"
	"nightbench/instruments/link"
)

// SupplyAt is all that has to be remembered of a supply to switch it off again.
type SupplyAt struct {
	Address string `json:"address"`
	Dialect string `json:"dialect"` // Info.From
	Channel int    `json:"channel"`
}

// SupplyAt is what to remember before the output goes on.
func (b *Opened) SupplyAt() SupplyAt {
	i := b.Info[0]
	return SupplyAt{Address: i.Address, Dialect: i.From, Channel: b.open[0].port.Channel}
}

// OpenSupply opens nothing but the supply, and says no word to it: enough to
// make safe when the rest of the bench, its file or the store is broken. A
// dialect that can't be found any more is replaced by the standard one, and
// that is logged: an output-off that is not understood does no harm.
func OpenSupply(ctx context.Context, at SupplyAt, o Options) (*Opened, error) {
	addr, err := link.Parse(at.Address)
	if err != nil {
		return nil, fmt.Errorf("supply: %w", err)
	}
	i := &instrument{slot: slot{name: "supply", role: dialect.RoleSupply, from: at.Dialect,
		port: Port{Address: addr, Dialect: at.Dialect, Channel: at.Channel}}}
	if i.d, err = supplyDialect(at.Dialect, o); err != nil {
		return nil, err
	}
	if err := i.dial(ctx, o); err != nil {
		return nil, fmt.Errorf("supply at %s: %w", at.Address, err)
	}
	s := driver.BareSupply(i.conn, i.d, driver.SupplyOptions{Options: i.options(o)})
	i.stop = s.Close
	i.info = Info{Name: i.name, Role: string(i.role), Address: at.Address, Dialect: i.d.Head.Name, Hash: i.d.Hash, From: at.Dialect}
	return &Opened{
		Bench: instruments.Bench{Supply: s, Scope: instruments.NoScope, Pot: instruments.NoPot, Cutoff: instruments.NoCutoff},
		Info:  []Info{i.info}, open: []*instrument{i},
	}, nil
}

// lastResort is the dialect of a supply whose own can't be found.
const lastResort = "standard-supply"

func supplyDialect(name string, o Options) (*dialect.Dialect, error) {
	d, err := dialect.Find(dialect.RoleSupply, name)
	if err == nil {
		return d, nil
	}
	if o.Log != nil {
		o.Log(fmt.Sprintf("supply: dialect %q: %v; going on with %s", name, err, lastResort))
	}
	d, again := dialect.Find(dialect.RoleSupply, lastResort)
	return d, errors.Join(again)
}
