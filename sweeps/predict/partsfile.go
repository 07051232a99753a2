package predict

import (
	"bytes"
	"errors"
	"fmt"
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
	var c Catalogue
	if err := toml.NewDecoder(bytes.NewReader(text)).DisallowUnknownFields().Decode(&c); err != nil {
		return Catalogue{}, mistakes(name, err)
	}
	c.check(f)
	return c, f.Failed()
}

// mistakes gives the places of what the TOML library refused, which it keeps apart from its messages.
func mistakes(name string, err error) error {
	var unknown *toml.StrictMissingError
	var bad *toml.DecodeError
	switch {
	case errors.As(err, &unknown):
		var all userfile.Errors
		for i := range unknown.Errors {
			all = append(all, mistake(name, &unknown.Errors[i], "unknown key: no part has it"))
		}
		return all
	case errors.As(err, &bad):
		return mistake(name, bad, `is of another kind than this key has: a figure is written like { typical = 1e-9, source = "data sheet" }, text in quotes, rows in brackets`)
	}
	return &userfile.Error{File: name, Want: err.Error(), Err: err}
}

func mistake(name string, e *toml.DecodeError, want string) *userfile.Error {
	line, _ := e.Position()
	return &userfile.Error{File: name, Line: line, Key: strings.Join(e.Key(), "."), Want: want, Err: e}
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
