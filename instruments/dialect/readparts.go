package dialect

import (
	"fmt"
	"time"

	"nightbench/instruments/link"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// ends are the ends of a message, by name.
var ends = map[string]string{"nl": "\n", "cr": "\r", "crnl": "\r\n", "": ""}

// link reads [link]. What is more than a time-out needs a source.
func (r *reader) link(t *userfile.Table) {
	o, l := t.Optional(), &r.d.Link
	var end, reply string
	userfile.Word(o, "terminator", &end, "nl", "cr", "crnl")
	userfile.Word(o, "reply_end", &reply, "nl", "cr")
	l.Terminator = ends[end]
	if reply == "cr" {
		l.ReplyEnd = '\r'
	}
	o.Strings("kinds", &l.Kinds)
	for _, k := range l.Kinds {
		if k != "serial" && k != "tcp" && k != "usbtmc" && k != "hislip" {
			t.Fail("kinds", fmt.Sprintf("%q is no kind of link; use serial, tcp, usbtmc, hislip", k))
		}
	}
	o.Int("port", &l.Port, 1, 65535)
	r.duration(o, "timeout", &l.Timeout)
	r.duration(o, "gap", &l.Gap)
	o.Bool("echo", &l.Echo)
	o.Int("longest", &l.Longest, 8, 1<<20)
	r.serialLine(o, &l.Line)
	r.deviceClear(o, l)
	for _, key := range t.Keys() {
		if key != "timeout" {
			r.source(t, &l.Source)
			return
		}
	}
}

// deviceClear reads how the family forgets a message in hand.
func (r *reader) deviceClear(o *userfile.Table, l *Link) {
	userfile.Word(o, "clear", &l.Clear, "bytes", "break", "socket", "usbtmc", "reopen", "none")
	var clear []int
	o.Ints("clear_bytes", &clear, 0, 255)
	for _, b := range clear {
		l.ClearBytes = append(l.ClearBytes, byte(b))
	}
	o.String("clear_reply", &l.ClearReply)
	if l.Clear == "" && len(clear) > 0 {
		l.Clear = "bytes"
	}
	if (l.Clear == "bytes") != (len(clear) > 0) {
		o.Fail("clear", `clear = "bytes" and clear_bytes belong together`)
	}
	if l.ClearReply != "" && l.Clear != "break" {
		o.Fail("clear_reply", `goes with clear = "break"`)
	}
}

// serialLine reads serial settings in the form that an address has them.
func (r *reader) serialLine(o *userfile.Table, v *string) {
	if !o.String("line", v) {
		return
	}
	if _, err := link.Parse("serial:///dev/any?" + *v); err != nil {
		o.Fail("line", `give serial settings as an address has them, like "baud=9600&stop=2": `+err.Error())
	}
}

// duration reads a time above zero.
func (r *reader) duration(t *userfile.Table, key string, v *time.Duration) {
	var x si.Time
	if !t.Text(key, &x) {
		return
	}
	if x.SI() <= 0 {
		t.Fail(key, "give a time above 0 s")
	}
	*v = time.Duration(x.SI() * float64(time.Second))
}

func (r *reader) errors(t *userfile.Table) {
	e := &r.d.Errors
	userfile.Word(t, "form", &e.Form, "queue", "events", "text", "none")
	if e.Form == "none" {
		r.source(t.Optional(), &e.Source)
		return
	}
	o := t.Optional()
	t.String("ask", &e.Ask)
	if e.Form == "events" {
		t.String("status", &e.Status)
		o.Int("again", &e.Again, 1, 1<<20)
	}
	from := o
	if e.Form == "text" {
		from = t // without a code nothing else says that there is none
	}
	from.Strings("none", &e.None)
	t.Int("depth", &e.Depth, 1, 1000)
	e.Sign = "negative"
	userfile.Word(o, "sign", &e.Sign, "negative", "positive")
	r.source(t, &e.Source)
}

func (r *reader) completion(t *userfile.Table) {
	if !t.Present() {
		return
	}
	c := &Completion{}
	userfile.Word(t, "style", &c.Style, "held", "polled", "dwell")
	switch c.Style {
	case "dwell":
		r.duration(t, "dwell", &c.Dwell)
	case "polled":
		t.String("ask", &c.Ask)
		t.Strings("until", &c.Until)
	default:
		t.String("ask", &c.Ask)
		c.Until = []string{"1", "+1"}
		t.Optional().Strings("until", &c.Until)
	}
	r.source(t, &c.Source)
	r.d.Completion = c
}

func (r *reader) channel(t *userfile.Table) {
	if !t.Present() {
		return
	}
	c, o := &Channel{}, t.Optional()
	if sub := o.Table("select"); sub.Present() {
		l := r.line(sub, "select", spec{does: "select a channel", needs: anyHalf, channel: true})
		c.Select = &l
	}
	o.Int("count", &c.Count, 1, 99)
	if o.Strings("names", &c.Names) && c.Count == 0 {
		c.Count = len(c.Names)
	}
	if len(c.Names) > 0 && len(c.Names) != c.Count {
		t.Fail("names", fmt.Sprintf("%d names for %d channels", len(c.Names), c.Count))
	}
	if c.Count > 0 {
		r.source(t, &c.Source)
	}
	if c.Select == nil && c.Count == 0 {
		t.Fail("", "says nothing; give select, count or names")
	}
	r.d.Channel = c
}

// conditions reads what the limits of error hold for.
func (r *reader) conditions(t *userfile.Table) {
	if !t.Present() {
		return
	}
	c, o := &Conditions{}, t.Optional()
	userfile.Word(t, "interval", &c.Interval, "24 h", "90 d", "1 y", "2 y")
	o.String("temperature", &c.Temperature)
	r.duration(o, "warm_up", &c.WarmUp)
	o.String("speed", &c.Speed)
	o.Bool("auto_zero", &c.AutoZero)
	r.source(t, &c.Source)
	r.d.Conditions = c
}
