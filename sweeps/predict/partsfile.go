package predict

import (
	"errors"
	"fmt"
	"reflect"
	"strings"

	"nightbench/instruments/userfile"
	"nightbench/sweeps"

	"github.com/pelletier/go-toml/v2"
)

// parseParts reads one file of parts, strictly: its mistakes are userfile.Errors.
func parseParts(name string, text []byte) (Catalogue, error) {
	f, err := userfile.Parse(name, text)
	if err != nil {
		return Catalogue{}, err
	}
	ask(f.Root().Optional(), reflect.TypeFor[Catalogue]())
	if err := f.Err(); err != nil {
		return Catalogue{}, err
	}
	var c Catalogue
	if err := toml.Unmarshal(text, &c); err != nil {
		return Catalogue{}, mistake(name, err)
	}
	c.check(f)
	return c, f.Failed()
}

// ask makes the keys of a part known to its table, from the fields of its type; what
// is left over, or is no table where one has to be, is a mistake.
func ask(t *userfile.Table, part reflect.Type) {
	for i := range part.NumField() {
		key, of := part.Field(i).Tag.Get("toml"), part.Field(i).Type
		switch {
		case of.Kind() == reflect.Struct:
			ask(t.Table(key).Optional(), of)
		case of.Kind() == reflect.Slice && of.Elem().Kind() == reflect.Struct:
			for _, sub := range t.Tables(key) {
				ask(sub.Optional(), of.Elem())
			}
		default:
			t.Known(key)
		}
	}
}

// mistake gives the place of a value of another kind than its key has, which the TOML library keeps apart from its message.
func mistake(name string, err error) error {
	e := &userfile.Error{File: name, Want: err.Error(), Err: err}
	var bad *toml.DecodeError
	if errors.As(err, &bad) {
		e.Line, _ = bad.Position()
		e.Key = strings.Join(bad.Key(), ".")
		e.Want = "is of another kind than this key has: numbers stand without quotes, text in quotes, rows in brackets"
	}
	return e
}

// twice refuses a part of a user's file that an earlier part of the user's has the name of, in this file or another.
func (c *Catalogue) twice(file sweeps.File, more Catalogue) error {
	f := userfile.Reopen(file.Name, file.Text)
	seen := map[string]bool{}
	for kind, names := range c.names() {
		for _, n := range names {
			seen[kind+" "+strings.ToLower(n)] = true
		}
	}
	for kind, names := range more.names() {
		for i, n := range names {
			key := kind + " " + strings.ToLower(n)
			if seen[key] {
				f.Look(kind, i).Fail("name", fmt.Sprintf("a %s of this name is in your parts files already; give it another name, or keep one of the two", kind))
			}
			seen[key] = true
		}
	}
	return f.Failed()
}

// names are those of the parts, by the key of their tables.
func (c *Catalogue) names() map[string][]string {
	all := map[string][]string{}
	for _, p := range c.Timers {
		all["timer"] = append(all["timer"], p.Name)
	}
	for _, p := range c.Diodes {
		all["diode"] = append(all["diode"], p.Name)
	}
	for _, p := range c.Transistors {
		all["transistor"] = append(all["transistor"], p.Name)
	}
	for _, p := range c.Motors {
		all["motor"] = append(all["motor"], p.Name)
	}
	return all
}
