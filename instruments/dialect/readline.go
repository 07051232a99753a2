package dialect

import (
	"fmt"
	"strings"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// line reads one line and holds it against what its role wants of it.
func (r *reader) line(t *userfile.Table, name string, s spec) Line {
	o, l := t.Optional(), Line{Name: name, Reply: ReplyNumber}
	o.String("send", &l.Send)
	o.String("ask", &l.Ask)
	r.halves(t, l, s)
	r.placeholders(t, l, s)
	if l.Ask != "" {
		r.reply(o, &l)
	}
	if l.Send != "" && l.Ask != "" {
		var within si.Ratio
		o.Text("within", &within)
		l.Within = within.SI()
		r.quantity(o, "step", s.unit, &l.Step)
	}
	r.source(t, &l.Source)
	o.String("note", &l.Note)
	return l
}

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
func (r *reader) reply(o *userfile.Table, l *Line) {
	userfile.Word(o, "reply", &l.Reply, ReplyNumber, ReplyBool, ReplyBit, ReplyText, ReplyNumbers, ReplyBlock)
	switch l.Reply {
	case ReplyNumber:
		o.String("unit", &l.Unit)
		o.Strings("overload", &l.Overload)
		o.Strings("no_value", &l.NoValue)
		l.Scale, l.Infinity = 1, "overload"
		userfile.Word(o, "infinity", &l.Infinity, "overload", "no measurement")
		if o.Number("scale", &l.Scale) && l.Scale == 0 {
			o.Fail("scale", "a factor of 0 leaves nothing; give what a reply is multiplied by")
		}
	case ReplyBool:
		l.Yes, l.No = []string{"1", "+1"}, []string{"0", "+0"}
		o.Strings("yes", &l.Yes)
		o.Strings("no", &l.No)
	case ReplyBit:
		l.Base = "decimal"
		o.Int("bit", &l.Bit, 0, 31)
		userfile.Word(o, "base", &l.Base, "decimal", "hex")
	case ReplyText:
		o.Strings("want", &l.Want)
	case ReplyNumbers:
		o.Strings("fields", &l.Fields)
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
