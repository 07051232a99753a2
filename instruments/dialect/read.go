package dialect

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"

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
	r := &reader{d: &Dialect{Text: f.Source, Hash: hex.EncodeToString(sum[:]), Sources: map[string]string{}, Commands: map[string]Line{}, Scaling: map[string]Line{}}}
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
	r.screen(f.Optional().Table("screen"))
	r.figures(f.Optional())
	r.conditions(f.Optional().Table("conditions"))
	switch r.d.Head.Role {
	case RoleSupply:
		r.protection(f.Optional().Table("protection"))
	case RoleMeter:
		r.meter(f)
	case RoleScope:
		r.waveform(f.Table("waveform"))
		r.scaling(f)
		r.wholeScope(f.Table("command"))
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
	ok = userfile.Word(t, "role", &h.Role, RoleSupply, RoleMeter, RoleScope, RolePot, RoleCutoff, RoleProbe) && ok
	t.Optional().String("about", &h.About)
	t.Optional().Bool("accepts_any", &h.AcceptsAny)
	t.Optional().String("tried", &h.Tried)
	return ok
}

func (r *reader) sources(t *userfile.Table) {
	for _, tag := range t.Keys() {
		var document string
		if t.String(tag, &document) {
			r.d.Sources[tag] = document
		}
		if tag == Ours || tag == Unchecked {
			t.Fail(tag, "is a word with a meaning of its own; give the document another tag")
		}
	}
}

// source reads who says so, which every line must carry.
// Keys of a section that are from memory, while the rest is from its source, are
// listed as unchecked.
func (r *reader) source(t *userfile.Table, v *string) {
	r.sourceOf(t, "source", v)
	if !t.Has("unchecked") {
		return
	}
	var keys []string
	t.Strings("unchecked", &keys)
	for _, key := range keys {
		if !t.Has(key) {
			t.Fail("unchecked", fmt.Sprintf("there is no key %q here", key))
		}
		r.d.Memory = append(r.d.Memory, t.Path()+"."+key)
	}
}

func (r *reader) sourceOf(t *userfile.Table, key string, v *string) {
	if !t.String(key, v) {
		return
	}
	if _, known := r.d.Sources[*v]; !known && *v != Ours && *v != Unchecked {
		t.Fail(key, `no such tag in [sources]; add it there, or use "unchecked" for what is from memory, "ours" for an addition of your own`)
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

func (r *reader) protection(t *userfile.Table) {
	if !t.Present() {
		return
	}
	p := &Protection{}
	t.Bool("clear_energises", &p.ClearEnergises)
	r.source(t, &p.Source)
	r.d.Protection = p
}

// sequences reads the lines sent at opening, after a reset and at closing.
func (r *reader) sequences(f *userfile.Table) {
	free := spec{does: "be opened or closed", needs: anyHalf, channel: true}
	for name, into := range map[string]*[]Line{"open": &r.d.Open, "setup": &r.d.Setup, "close": &r.d.Close} {
		for _, t := range f.Tables(name) {
			*into = append(*into, r.line(t, name, free))
		}
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

// oneFunction wants a meter to measure something, each function whole and with a reading.
func (r *reader) oneFunction(t *userfile.Table) {
	has := func(name string) bool { _, ok := r.d.Commands[name]; return ok }
	var any bool
	for _, of := range []string{"voltage", "current"} {
		function := has(of + "_function")
		any = any || function
		if function != has(of+"_range") {
			t.Fail("", fmt.Sprintf("%s_function and %s_range belong together; give both or neither", of, of))
		}
		if function && !has("read") && !has(of+"_read") {
			t.Fail("", fmt.Sprintf("there is no way to take a reading: give read, or %s_read", of))
		}
	}
	if !any {
		t.Fail("", "neither voltage_function nor current_function is there: a meter has to measure something")
	}
}
