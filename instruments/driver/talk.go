package driver

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// say sends a line, and reads it back where the line says how.
func (i *instrument) say(ctx context.Context, l dialect.Line, p dialect.Put) error {
	if err := i.tell(ctx, l, p); err != nil {
		return err
	}
	if l.Ask == "" {
		return nil
	}
	reply, err := i.word(ctx, l, p)
	if err != nil {
		return i.explain(ctx, err)
	}
	for _, want := range l.Want {
		if strings.EqualFold(reply, p.Fill(want)) {
			return nil
		}
	}
	return i.refused(ctx, p.Fill(l.Send), reply)
}

// ensure is say for a line by name.
func (i *instrument) ensure(ctx context.Context, name string, p dialect.Put) error {
	l, err := i.line(name)
	if err != nil {
		return err
	}
	return i.say(ctx, l, p)
}

// tell sends a line that has no reply.
func (i *instrument) tell(ctx context.Context, l dialect.Line, p dialect.Put) error {
	if err := i.ready(ctx); err != nil {
		return err
	}
	return i.write(ctx, p.Fill(l.Send))
}

// ready mends the link and selects the channel.
func (i *instrument) ready(ctx context.Context) error {
	if err := i.mend(ctx); err != nil || i.d.Channel == nil {
		return err
	}
	return i.write(ctx, i.put(0).Fill(i.d.Channel.Select.Send))
}

// mend opens a lost link anew, which proves that the same instrument answers.
func (i *instrument) mend(ctx context.Context) error {
	if !i.lost.Load() {
		return nil
	}
	if err := i.conn.Reopen(ctx); err != nil {
		return i.fault("opening its link anew", err)
	}
	i.lost.Store(false)
	return nil
}

// write sends one message that has no reply.
func (i *instrument) write(ctx context.Context, command string) error {
	if err := i.conn.Write(ctx, command); err != nil {
		return i.fault(command, err)
	}
	return nil
}

// ask sends the query of a line and hands the reply to parse.
func (i *instrument) ask(ctx context.Context, l dialect.Line, p dialect.Put, parse func(string) error) error {
	if err := i.ready(ctx); err != nil {
		return err
	}
	query := p.Fill(l.Ask)
	if err := i.conn.QueryAs(ctx, query, parse); err != nil {
		return i.fault(query, err)
	}
	return nil
}

// number asks for a number.
func (i *instrument) number(ctx context.Context, l dialect.Line, p dialect.Put) (n scpi.Number, err error) {
	err = i.ask(ctx, l, p, func(reply string) error {
		n, err = parseNumber(l, reply)
		return err
	})
	return n, err
}

// parseNumber reads a reply in the form of its line.
func parseNumber(l dialect.Line, reply string) (scpi.Number, error) {
	if slices.Contains(l.Overload, reply) {
		return scpi.Number{Outcome: scpi.Overload, Raw: reply}, nil
	}
	form := scpi.NumberForm{NoValue: l.NoValue, InfinityIsNoMeasurement: l.Infinity == "no measurement"}
	if l.Unit != "" {
		form.Units = []string{l.Unit}
	}
	n, err := form.Parse(reply)
	n.Value *= l.Scale
	return n, err
}

// measured asks for a number that must be one.
func (i *instrument) measured(ctx context.Context, l dialect.Line, p dialect.Put) (float64, error) {
	n, err := i.number(ctx, l, p)
	if err == nil && n.Outcome != scpi.Measured {
		err = &Error{Instrument: i.name, Command: p.Fill(l.Ask), Found: n.Raw, Err: fmt.Errorf("%w: %s", ErrReply, n.Outcome)}
	}
	return n.Value, err
}

// flag asks for yes or no.
func (i *instrument) flag(ctx context.Context, name string) (yes bool, err error) {
	l, err := i.line(name)
	if err != nil {
		return false, err
	}
	err = i.ask(ctx, l, i.put(0), func(reply string) error {
		yes, err = parseFlag(l, reply)
		return err
	})
	return yes, err
}

func parseFlag(l dialect.Line, reply string) (bool, error) {
	if l.Reply != dialect.ReplyBit {
		words := map[string]bool{}
		for _, w := range l.No {
			words[strings.ToUpper(w)] = false
		}
		for _, w := range l.Yes {
			words[strings.ToUpper(w)] = true
		}
		return scpi.ParseBool(reply, words)
	}
	base, digits := 10, strings.TrimPrefix(strings.TrimSpace(reply), "+")
	if l.Base == "hex" {
		base, digits = 16, strings.TrimPrefix(strings.ToLower(digits), "0x")
	}
	bits, err := strconv.ParseUint(digits, base, 32)
	if err != nil {
		return false, fmt.Errorf("%w: %q is no %s number of a status word", scpi.ErrForm, reply, l.Base)
	}
	return bits>>l.Bit&1 == 1, nil
}

// word asks for text and takes its quotes off.
func (i *instrument) word(ctx context.Context, l dialect.Line, p dialect.Put) (word string, err error) {
	err = i.ask(ctx, l, p, func(reply string) error {
		word = strings.TrimSpace(reply)
		if bare, err := scpi.ParseString(word); err == nil {
			word = bare
		}
		return nil
	})
	return word, err
}

// assign sends a setting and returns what it is now.
func (i *instrument) assign(ctx context.Context, name string, p dialect.Put) (l dialect.Line, found float64, err error) {
	if l, err = i.line(name); err != nil {
		return l, 0, err
	}
	if math.IsNaN(p.Value) || math.IsInf(p.Value, 0) {
		return l, 0, &Error{Instrument: i.name, Command: l.Send, Err: fmt.Errorf("%w: %v is no setting", ErrRefused, p.Value)}
	}
	if err = i.tell(ctx, l, p); err != nil {
		return l, 0, err
	}
	if found, err = i.measured(ctx, l, p); err != nil {
		err = i.explain(ctx, err)
	}
	return l, found, err
}

// set sends a setting and fails when it reads back as another.
func (i *instrument) set(ctx context.Context, name string, p dialect.Put, unit si.Unit) (float64, error) {
	l, found, err := i.assign(ctx, name, p)
	if err != nil {
		return found, err
	}
	if !l.Agrees(p.Value, found) {
		return found, i.refused(ctx, p.Fill(l.Send), si.Format(found, unit))
	}
	return found, nil
}

// done waits until all operations have ended, in the dialect's way. A dialect
// without one leaves it to the next query to wait.
func (i *instrument) done(ctx context.Context) error {
	c := i.d.Completion
	if c == nil {
		return nil
	}
	for {
		reply, err := i.conn.Query(ctx, c.Ask)
		if err != nil {
			return err
		}
		if c.Style == "held" || strings.TrimSpace(reply) == c.Until {
			return nil
		}
		if err := i.clock.Wait(ctx, pollEvery); err != nil {
			return err
		}
	}
}

// errors reads the error queue until it is empty.
func (i *instrument) errors(ctx context.Context) ([]scpi.Fault, error) {
	if i.d.Errors.Form == "none" {
		return nil, nil
	}
	if err := i.mend(ctx); err != nil {
		return nil, err
	}
	faults, err := i.conn.Errors(ctx)
	if err != nil {
		return faults, i.fault(i.d.Errors.Ask, err)
	}
	return faults, nil
}

// clean fails when the instrument has complained since the queue was last read.
func (i *instrument) clean(ctx context.Context, after string) error {
	faults, err := i.errors(ctx)
	if err != nil || len(faults) == 0 {
		return err
	}
	return &Error{Instrument: i.name, Command: after, Found: list(faults), Err: ErrComplained,
		Try: "is the right dialect named for it? nightbench ask shows what it accepts"}
}
