package dialect

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"time"

	"nightbench/instruments/link"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// Parse reads and checks a dialect. Mistakes are userfile.Errors, with file and line.
func Parse(name string, text []byte) (*Dialect, error) {
	f, err := userfile.Parse(name, text)
	if err != nil {
		return nil, err
	}
	return read(f)
}

// read takes a dialect out of a file whose form is right.
func read(f *userfile.File) (*Dialect, error) {
	sum := sha256.Sum256([]byte(f.Source))
	r := &reader{d: &Dialect{Text: f.Source, Hash: hex.EncodeToString(sum[:]), Sources: map[string]string{}, Commands: map[string]Line{}}}
	if !r.head(f.Table("dialect")) {
		return nil, f.Failed() // without a role no other key can be judged
	}
	r.sources(f.Optional().Table("sources"))
	r.identities(f.Optional())
	r.link(f.Optional().Table("link"))
	r.errors(f.Table("errors"))
	r.completion(f.Optional().Table("completion"))
	r.channel(f.Optional().Table("channel"))
	r.commands(f.Table("command"))
	r.sequences(f.Optional())
	r.figures(f.Optional())
	switch r.d.Head.Role {
	case RoleSupply:
		r.protection(f.Optional().Table("protection"))
	case RoleMeter:
		r.meter(f)
	case RoleScope:
		r.waveform(f.Table("waveform"))
	}
	if err := f.Err(); err != nil {
		return nil, err
	}
	return r.d, nil
}

// reader fills one dialect.
type reader struct{ d *Dialect }

func (r *reader) head(t *userfile.Table) bool {
	h := &r.d.Head
	ok := t.String("name", &h.Name)
	ok = userfile.Word(t, "role", &h.Role, RoleSupply, RoleMeter, RoleScope, RolePot) && ok
	t.Optional().String("about", &h.About)
	t.Optional().Bool("accepts_any", &h.AcceptsAny)
	return ok
}

func (r *reader) sources(t *userfile.Table) {
	for _, tag := range t.Keys() {
		var document string
		if t.String(tag, &document) {
			r.d.Sources[tag] = document
		}
		if tag == "ours" || tag == "unchecked" {
			t.Fail(tag, "is a word with a meaning of its own; give the document another tag")
		}
	}
}

// source reads who says so, which every line must carry.
func (r *reader) source(t *userfile.Table, v *string) {
	if !t.String("source", v) {
		return
	}
	if _, known := r.d.Sources[*v]; !known && *v != "ours" && *v != "unchecked" {
		t.Fail("source", `no such tag in [sources]; add it there, or use "unchecked" for what is from memory, "ours" for an addition of your own`)
	}
}

func (r *reader) identities(f *userfile.Table) {
	for _, t := range f.Tables("identity") {
		var p Pattern
		if t.Has("text") {
			t.String("text", &p.Text)
		} else {
			t.String("maker", &p.Maker)
			t.String("model", &p.Model)
		}
		r.source(t, &p.Source)
		r.d.Identities = append(r.d.Identities, p)
	}
}

// terminators are the ends of a message sent, by name.
var terminators = map[string]string{"nl": "\n", "cr": "\r", "crnl": "\r\n", "": ""}

func (r *reader) link(t *userfile.Table) {
	o, l := t.Optional(), &r.d.Link
	var end string
	userfile.Word(o, "terminator", &end, "nl", "cr", "crnl")
	l.Terminator = terminators[end]
	r.duration(o, "timeout", &l.Timeout)
	r.duration(o, "gap", &l.Gap)
	o.Bool("echo", &l.Echo)
	r.serialLine(o, &l.Line)
	var clear []int
	o.Ints("clear_bytes", &clear, 0, 255)
	for _, b := range clear {
		l.ClearBytes = append(l.ClearBytes, byte(b))
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
	userfile.Word(t, "form", &e.Form, "queue", "none")
	if e.Form == "none" {
		return
	}
	t.String("ask", &e.Ask)
	t.Int("depth", &e.Depth, 1, 1000)
	r.source(t, &e.Source)
}

func (r *reader) completion(t *userfile.Table) {
	if !t.Present() {
		return
	}
	c := &Completion{}
	userfile.Word(t, "style", &c.Style, "held", "polled")
	t.String("ask", &c.Ask)
	if c.Style == "polled" {
		t.String("until", &c.Until)
	}
	r.source(t, &c.Source)
	r.d.Completion = c
}

func (r *reader) channel(t *userfile.Table) {
	if !t.Present() {
		return
	}
	c := &Channel{}
	c.Select = r.line(t.Table("select"), "select", spec{does: "select a channel", needs: sends, channel: true})
	r.d.Channel = c
}

func (r *reader) protection(t *userfile.Table) {
	if !t.Present() {
		return
	}
	p := &Protection{}
	t.Bool("clear_energises", &p.ClearEnergises)
	r.source(t, &p.Source)
	r.d.Protection = p
}

// sequences reads the lines sent at opening and closing.
func (r *reader) sequences(f *userfile.Table) {
	free := spec{does: "be opened or closed", needs: sends, channel: true}
	for _, t := range f.Tables("open") {
		r.d.Open = append(r.d.Open, r.line(t, "open", free))
	}
	for _, t := range f.Tables("close") {
		r.d.Close = append(r.d.Close, r.line(t, "close", free))
	}
}

// commands reads the lines of the role.
func (r *reader) commands(t *userfile.Table) {
	for _, names := range []map[string]spec{common, lines[r.d.Head.Role]} {
		for name, s := range names {
			from := t
			if !s.required {
				from = t.Optional()
			}
			if sub := from.Table(name); sub.Present() {
				r.d.Commands[name] = r.line(sub, name, s)
			}
		}
	}
	if r.d.Head.Role == RoleMeter {
		r.oneFunction(t)
	}
}

// oneFunction wants a meter to measure something, and each function whole.
func (r *reader) oneFunction(t *userfile.Table) {
	var any bool
	for _, of := range []string{"voltage", "current"} {
		_, function := r.d.Commands[of+"_function"]
		_, ranges := r.d.Commands[of+"_range"]
		any = any || function
		if function != ranges {
			t.Fail("", fmt.Sprintf("%s_function and %s_range belong together; give both or neither", of, of))
		}
	}
	if !any {
		t.Fail("", "neither voltage_function nor current_function is there: a meter has to measure something")
	}
}
