package bench

import (
	"context"
	"errors"
	"fmt"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver"
	"nightbench/instruments/link"
)

// OpenSupply opens nothing but the supply: enough to make safe when the rest
// of the bench, its file or the store is broken. Named is what found its
// dialect (Info.From); channel 0 means 1. With a dialect that is named no word
// is said to the instrument here. With auto it is asked who it is; where that,
// or the dialect itself, can't be had any more, the standard one is used and
// that is logged: an output-off that is not understood does no harm.
func OpenSupply(ctx context.Context, address, named string, channel int, o Options) (*Opened, error) {
	addr, err := link.Parse(address)
	if err != nil {
		return nil, fmt.Errorf("supply: %w", err)
	}
	i := &instrument{slot: slot{name: "supply", role: dialect.RoleSupply, from: named, port: Port{Address: addr, Dialect: named, Channel: channel}}}
	if named != "" && named != Auto {
		if err := i.useOrFallBack(o); err != nil {
			return nil, err
		}
	}
	if err := i.dial(ctx, o); err != nil {
		return nil, fmt.Errorf("supply at %s: %w", address, err)
	}
	if i.d == nil {
		if err := i.findOrFallBack(ctx, o); err != nil {
			return nil, errors.Join(err, i.link.Close())
		}
	}
	s := driver.BareSupply(i.conn, i.d, i.supplyOptions(instruments.SupplyWiring{}, o))
	i.stop = s.Close
	i.info.Name, i.info.Role, i.info.Address = i.name, string(i.role), address
	i.info.Dialect, i.info.Hash, i.info.From = i.d.Head.Name, i.d.Hash, i.from
	return &Opened{
		Bench: instruments.Bench{Supply: s, Scope: instruments.NoScope, Pot: instruments.NoPot, Cutoff: instruments.NoCutoff},
		Info:  []Info{i.info}, open: []*instrument{i},
	}, nil
}

// lastResort is the dialect of a supply whose own can't be found.
const lastResort = "standard-supply"

// useOrFallBack takes the dialect that is named, or the last resort.
func (i *instrument) useOrFallBack(o Options) (err error) {
	if i.d, err = dialect.Find(dialect.RoleSupply, i.from); err == nil {
		return nil
	}
	return i.fallBack(o, err)
}

// findOrFallBack takes the dialect that the supply's identity asks for, or the last resort.
func (i *instrument) findOrFallBack(ctx context.Context, o Options) error {
	ctx, cancel := context.WithTimeout(ctx, askWithin)
	defer cancel()
	id, err := i.conn.Identify(ctx)
	if err == nil {
		i.info.Identity = id
		err = i.recognise(id)
	}
	if err != nil {
		err = i.fallBack(o, err)
	}
	i.connect(id.Raw, o)
	return err
}

// askWithin bounds the question who it is, while the output may be on.
const askWithin = 3 * time.Second

func (i *instrument) fallBack(o Options, why error) (err error) {
	if o.Log != nil {
		o.Log(fmt.Sprintf("supply: %v; going on with %s to switch it off", why, lastResort))
	}
	i.from = lastResort
	i.d, err = dialect.Find(dialect.RoleSupply, lastResort)
	return err
}
