package dialect

import (
	"path"
	"strings"

	"nightbench/instruments"
)

// Pattern matches an identity: Maker and Model with "*" for anything, or Text
// for the whole reply of instruments that do not answer in four fields. Case
// and blanks at the ends do not matter. A serial number is never required: 0 is common.
type Pattern struct {
	Maker, Model string
	Text         string
	Source       string
}

// Matches tells whether an instrument is of this pattern.
func (p Pattern) Matches(id instruments.Identity) bool {
	if p.Text != "" {
		return glob(p.Text, id.Raw)
	}
	return glob(p.Maker, id.Maker) && glob(p.Model, id.Model)
}

func glob(pattern, text string) bool {
	fold := func(s string) string {
		return strings.ReplaceAll(strings.ToLower(strings.TrimSpace(s)), "/", "\x00") // a slash is an ordinary letter here
	}
	ok, err := path.Match(fold(pattern), fold(text))
	return ok && err == nil
}

// Matches tells whether one of the dialect's own patterns matches.
func (d *Dialect) Matches(id instruments.Identity) bool {
	for _, p := range d.Identities {
		if p.Matches(id) {
			return true
		}
	}
	return false
}

// Match finds the dialect among all whose pattern matches an identity.
func Match(all []*Dialect, id instruments.Identity) (*Dialect, bool) {
	for _, d := range all {
		if d.Matches(id) {
			return d, true
		}
	}
	return nil, false
}
