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
	if err := i.ready(ctx); err != nil {
		return err
	}
	return i.utter(ctx, l, p)
}

// utter is say on a link that is ready.
func (i *instrument) utter(ctx context.Context, l dialect.Line, p dialect.Put) error {
	if err := i.write(ctx, l, p); err != nil || l.Ask == "" {
		return err
	}
	var found string
	err := i.query(ctx, l, p, func(answer string) error { found = unquoted(answer); return nil })
	if err != nil {
		return i.explain(ctx, err)
	}
	if i.wanted(l, p, found) {
		return nil
	}
	return i.refused(ctx, p.Fill(l.Send), found)
}

// wanted tells whether an answer is one of those that will do.
func (i *instrument) wanted(l dialect.Line, p dialect.Put, answer string) bool {
	return slices.ContainsFunc(l.Want, func(want string) bool { return strings.EqualFold(answer, p.Fill(want)) })
}

// ensure is say for a line by name.
func (i *instrument) ensure(ctx context.Context, name string, p dialect.Put) error {
	l, err := i.line(name)
	if err != nil {
		return err
	}
	return i.say(ctx, l, p)
}

// tell sends a line and does not look at its read-back.
func (i *instrument) tell(ctx context.Context, l dialect.Line, p dialect.Put) error {
	if err := i.ready(ctx); err != nil {
		return err
	}
	return i.write(ctx, l, p)
}

// ready mends the link and selects the channel.
func (i *instrument) ready(ctx context.Context) error {
	if err := i.mend(ctx); err != nil || i.d.Channel == nil || i.d.Channel.Select == nil {
		return err
	}
	return i.utter(ctx, *i.d.Channel.Select, i.put(0))
}

// mend opens a lost link anew, which proves that the same instrument answers,
// and says again what it has to hear before anything else.
func (i *instrument) mend(ctx context.Context) error {
	if i.lost.Load() {
		if err := i.conn.Reopen(ctx); err != nil {
			return i.fault("opening its link anew", err)
		}
		i.lost.Store(false)
		i.greet.Store(true)
	}
	if !i.greet.Swap(false) {
		return nil
	}
	return i.sequence(ctx, i.d.Open)
}

// write sends one message that has no reply.
func (i *instrument) write(ctx context.Context, l dialect.Line, p dialect.Put) error {
	command := p.Fill(l.Send)
	err := i.fits(command)
	if err == nil {
		err = i.conn.Resting(l.Rest).Write(ctx, command)
	}
	if err != nil {
		return i.fault(command, err)
	}
	return nil
}

// fits refuses a message that the instrument's buffer does not hold.
func (i *instrument) fits(message string) error {
	if most := i.d.Link.Longest; most > 0 && len(message) > most {
		return fmt.Errorf("%w: %d characters, and it takes %d", ErrRefused, len(message), most)
	}
	return nil
}

// ask sends the query of a line and hands the answer to parse.
func (i *instrument) ask(ctx context.Context, l dialect.Line, p dialect.Put, parse func(answer string) error) error {
	if err := i.ready(ctx); err != nil {
		return err
	}
	return i.query(ctx, l, p, parse)
}

// query is ask on a link that is ready.
func (i *instrument) query(ctx context.Context, l dialect.Line, p dialect.Put, parse func(answer string) error) error {
	for _, first := range l.Before {
		if err := i.write(ctx, dialect.Line{Send: first}, p); err != nil {
			return err
		}
	}
	query := p.Fill(l.Ask)
	err := i.fits(query)
	if err == nil {
		err = i.conn.QueryAs(ctx, query, func(reply string) error {
			answer, err := l.Answer(p, reply)
			if err != nil {
				return fmt.Errorf("%w: %w", scpi.ErrForm, err)
			}
			return parse(answer)
		})
	}
	if err != nil {
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
		return scpi.Number{Value: math.NaN(), Outcome: scpi.Overload, Negative: strings.HasPrefix(strings.TrimSpace(reply), "-"), Raw: reply}, nil
	}
	if len(l.Choices) > 0 {
		return chosen(l, reply)
	}
	form := scpi.NumberForm{NoValue: l.NoValue, InfinityIsNoMeasurement: l.Infinity == "no measurement"}
	if l.Unit != "" {
		form.Units = []string{l.Unit}
	}
	n, err := form.Parse(reply)
	n.Value *= l.Scale
	return n, err
}

// chosen reads the word of a choice.
func chosen(l dialect.Line, reply string) (scpi.Number, error) {
	v, ok := l.Chosen(unquoted(reply))
	if !ok {
		return scpi.Number{Value: math.NaN(), Raw: reply}, fmt.Errorf("%w: %q is none of its choices", scpi.ErrForm, reply)
	}
	return scpi.Number{Value: v, Outcome: scpi.Measured, Raw: reply}, nil
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
		yes, err = parseFlag(l, reply, i.channel)
		return err
	})
	return yes, err
}

func parseFlag(l dialect.Line, reply string, channel int) (bool, error) {
	if l.Reply != dialect.ReplyBit {
		words := map[string]bool{}
		for _, w := range l.No {
			words[strings.ToUpper(w)] = false
		}
		for _, w := range l.Yes {
			words[strings.ToUpper(w)] = true
		}
		return scpi.ParseBool(unquoted(reply), words)
	}
	bit, err := parseBit(l.Base, reply, l.Bit(channel))
	return (bit == 1) == (l.YesIs == 1), err
}

// bases are the number systems of status words.
var bases = map[string]int{"decimal": 10, "hex": 16, "binary": 2}

// parseBit takes one bit out of a status word, or one character out of a row of 0 and 1.
func parseBit(base, reply string, bit int) (int, error) {
	digits := strings.TrimSpace(reply)
	if base == "characters" {
		if bit >= len(digits) || digits[bit] != '0' && digits[bit] != '1' {
			return 0, fmt.Errorf("%w: character %d of %q is no 0 or 1", scpi.ErrForm, bit, reply)
		}
		return int(digits[bit] - '0'), nil
	}
	digits = strings.TrimPrefix(digits, "+")
	if base == "hex" {
		digits = strings.TrimPrefix(strings.ToLower(digits), "0x")
	}
	bits, err := strconv.ParseUint(digits, bases[base], 32)
	if err != nil {
		return 0, fmt.Errorf("%w: %q is no %s number of a status word", scpi.ErrForm, reply, base)
	}
	return int(bits >> bit & 1), nil
}

// word asks for text and takes its quotes off.
func (i *instrument) word(ctx context.Context, l dialect.Line, p dialect.Put) (word string, err error) {
	err = i.ask(ctx, l, p, func(answer string) error { word = unquoted(answer); return nil })
	return word, err
}

// unquoted is a text without quotes around it.
func unquoted(text string) string {
	text = strings.TrimSpace(text)
	if bare, err := scpi.ParseString(text); err == nil {
		return bare
	}
	return text
}

// assign sends a setting and returns what it is now.
func (i *instrument) assign(ctx context.Context, name string, p dialect.Put) (l dialect.Line, found float64, err error) {
	if l, err = i.line(name); err != nil {
		return l, 0, err
	}
	if math.IsNaN(p.Value) || math.IsInf(p.Value, 0) {
		return l, 0, &Error{Instrument: i.name, Command: l.Send, Err: fmt.Errorf("%w: %v is no setting", ErrRefused, p.Value)}
	}
	if p, err = l.Settle(p); err != nil {
		return l, 0, &Error{Instrument: i.name, Command: l.Send, Err: fmt.Errorf("%w: %w", ErrRefused, err)}
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
	if l, ok := i.d.Commands[name]; ok { // another value than this is not even sent
		if q, err := l.Settle(p); err == nil && !l.Agrees(p.Value, q.Value) {
			return 0, &Error{Instrument: i.name, Command: p.Fill(l.Send), Err: ErrRefused,
				Found: "that it can be set to " + si.Format(q.Value, unit) + " only", Try: "give a value that it has"}
		}
	}
	l, found, err := i.assign(ctx, name, p)
	if err != nil {
		return found, err
	}
	if !l.Agrees(p.Value, found) {
		return found, i.refused(ctx, p.Fill(l.Send), si.Format(found, unit))
	}
	return found, nil
}
