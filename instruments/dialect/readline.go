package dialect

import (
	"fmt"
	"strconv"
	"strings"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// line reads one line and holds it against what its role wants of it.
func (r *reader) line(t *userfile.Table, name string, s spec) Line {
	o, l := t.Optional(), Line{Name: name, Reply: ReplyNumber, Decimals: -1, Scale: 1}
	o.String("send", &l.Send)
	o.String("ask", &l.Ask)
	r.halves(t, l, s)
	r.placeholders(t, l, s)
	if l.Ask != "" {
		r.reply(o, &l, s)
		if o.Has("ask_source") {
			r.sourceOf(t, "ask_source", &l.AskSource)
		}
	}
	if l.Send != "" {
		r.duration(o, "rest", &l.Rest)
	}
	if l.Send != "" && l.Ask != "" {
		r.setting(o, &l, s)
	}
	r.source(t, &l.Source)
	o.String("note", &l.Note)
	return l
}

// setting reads what may be sent and how far what is read back may be from it.
func (r *reader) setting(o *userfile.Table, l *Line, s spec) {
	var within si.Ratio
	o.Text("within", &within)
	l.Within = within.SI()
	r.quantity(o, "step", s.unit, &l.Step)
	o.Int("decimals", &l.Decimals, 0, 12)
	var series string
	l.Series = userfile.Word(o, "series", &series, "1-2-5")
	if !o.Has("choices") {
		return
	}
	userfile.Pairs(o, "choices", func(v anyUnit, w word) { l.Choices = append(l.Choices, Choice{Value: v.si, Word: string(w)}) })
	for n, c := range l.Choices {
		if n > 0 && c.Value == l.Choices[n-1].Value {
			o.Fail("choices", fmt.Sprintf("%s stands there twice", Number(c.Value)))
		}
	}
}

// anyUnit reads volts, amperes, seconds or a plain number: what a choice is of is known only when its line is.
type anyUnit struct{ si float64 }

func (a *anyUnit) UnmarshalText(b []byte) error {
	var (
		volt si.Voltage
		amp  si.Current
		sec  si.Time
		one  si.Ratio
	)
	if x, err := strconv.ParseFloat(string(b), 64); err == nil {
		a.si = x
		return nil
	}
	for _, q := range []interface {
		UnmarshalText([]byte) error
		SI() float64
	}{&volt, &amp, &sec, &one} {
		if q.UnmarshalText(b) == nil {
			a.si = q.SI()
			return nil
		}
	}
	return fmt.Errorf("%q is no voltage, current, time or number", b)
}

// word is any text.
type word string

func (w *word) UnmarshalText(b []byte) error { *w = word(b); return nil }

// halves wants the halves of a line that its use needs.
func (r *reader) halves(t *userfile.Table, l Line, s spec) {
	want := map[shape]string{
		sends: "needs send, and no ask", asks: "needs ask, and no send",
		setting: "needs send and ask: a setting is read back", anyHalf: "needs send, or send and ask",
	}[s.needs]
	var ok bool
	switch s.needs {
	case sends:
		ok = l.Send != "" && l.Ask == ""
	case asks:
		ok = l.Send == "" && l.Ask != ""
	case setting:
		ok = l.Send != "" && l.Ask != ""
	case anyHalf:
		ok = l.Send != ""
	}
	if !ok {
		t.Fail("", want)
	}
	for key, text := range map[string]string{"send": l.Send, "ask": l.Ask} {
		if strings.ContainsAny(text, "\r\n") {
			t.Fail(key, "a message is one line; its end is added by the link")
		}
	}
}

// placeholders wants {value} where a value is set, and nothing unknown.
func (r *reader) placeholders(t *userfile.Table, l Line, s spec) {
	for key, text := range map[string]string{"send": l.Send, "ask": l.Ask} {
		names, err := placeholders(text)
		if err != nil {
			t.Fail(key, err.Error())
		}
		for _, n := range names {
			switch {
			case n == "value" && key == "send" && s.needs == setting:
			case n == "channel" && s.channel:
			default:
				t.Fail(key, fmt.Sprintf("{%s} means nothing here", n))
			}
		}
	}
	if s.needs == setting && l.Send != "" && !strings.Contains(l.Send, "{value}") {
		t.Fail("send", "has no place for the value; write {value} where it stands")
	}
}

// reply reads what the answer is.
func (r *reader) reply(o *userfile.Table, l *Line, s spec) {
	userfile.Word(o, "reply", &l.Reply, ReplyNumber, ReplyBool, ReplyBit, ReplyText, ReplyNumbers, ReplyBlock)
	o.Strings("before", &l.Before)
	r.freeText(o, "before", l.Before, s)
	o.Strings("prefix", &l.Prefix)
	r.freeText(o, "prefix", l.Prefix, s)
	o.Int("field", &l.Field, 1, 99)
	l.Separator = ","
	o.String("separator", &l.Separator)
	switch l.Reply {
	case ReplyNumber:
		r.numberReply(o, l, s)
	case ReplyBool:
		l.Yes, l.No = []string{"1", "+1"}, []string{"0", "+0"}
		o.Strings("yes", &l.Yes)
		o.Strings("no", &l.No)
	case ReplyBit:
		l.Base, l.Bits, l.YesIs = "decimal", []int{0}, 1
		o.Int("bit", &l.Bits[0], 0, 31)
		o.Ints("bits", &l.Bits, 0, 31)
		o.Int("yes_is", &l.YesIs, 0, 1)
		userfile.Word(o, "base", &l.Base, "decimal", "hex", "binary", "characters")
	case ReplyText:
		o.Strings("want", &l.Want)
	case ReplyNumbers:
		o.Strings("fields", &l.Fields)
	}
}

// freeText wants nothing but {channel} put into texts.
func (r *reader) freeText(o *userfile.Table, key string, texts []string, s spec) {
	for _, text := range texts {
		names, err := placeholders(text)
		if err != nil {
			o.Fail(key, err.Error())
		}
		for _, n := range names {
			if n != "channel" || !s.channel {
				o.Fail(key, fmt.Sprintf("{%s} means nothing here", n))
			}
		}
		if key == "before" && strings.ContainsAny(text, "?\r\n") {
			o.Fail(key, "a message without a reply, on one line")
		}
	}
}

// numberReply reads what a number may look like. Of a share it has to be said
// whether it is percent: 0.6 could be either.
func (r *reader) numberReply(o *userfile.Table, l *Line, s spec) {
	o.String("unit", &l.Unit)
	o.Strings("overload", &l.Overload)
	o.Strings("no_value", &l.NoValue)
	l.Infinity = "overload"
	userfile.Word(o, "infinity", &l.Infinity, "overload", "no measurement")
	if o.Number("scale", &l.Scale) && l.Scale == 0 {
		o.Fail("scale", "a factor of 0 leaves nothing; give what a reply is multiplied by")
	}
	if !s.share {
		return
	}
	var in string
	if !o.Has("in") {
		o.Fail("", `has to say what it answers: in = "percent" or in = "ratio"`)
	}
	if userfile.Word(o, "in", &in, "percent", "ratio") && in == "percent" {
		l.Scale = 0.01
	}
}

// quantity reads a quantity of a unit that is known only when the line is.
func (r *reader) quantity(t *userfile.Table, key string, unit si.Unit, v *float64) {
	var (
		volt si.Voltage
		amp  si.Current
		sec  si.Time
		one  si.Ratio
	)
	switch {
	case unit == si.Volt && t.Text(key, &volt):
		*v = volt.SI()
	case unit == si.Ampere && t.Text(key, &amp):
		*v = amp.SI()
	case unit == si.Second && t.Text(key, &sec):
		*v = sec.SI()
	case unit == si.One && t.Text(key, &one):
		*v = one.SI()
	}
	if *v < 0 {
		t.Fail(key, "give a value that is not negative")
	}
}
