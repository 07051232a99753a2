package bench

import (
	"errors"
	"strings"

	"nightbench/instruments/dialect"
	"nightbench/instruments/userfile"
)

// dialect refuses a dialect that does not exist, is for another kind of
// instrument, or is a file of the user's own with mistakes in it.
func (r *reader) dialect(t *userfile.Table, name string) {
	if name == Auto {
		return
	}
	kind, _, _ := strings.Cut(t.Path(), "[")
	role := dialect.Role(kind)
	_, err := dialect.Find(role, ownFile(name, r.file.Name))
	switch {
	case err == nil:
	case errors.Is(err, dialect.ErrUnknown):
		t.Suggest("dialect", name, dialect.Names(role), "no such dialect; use auto, "+strings.Join(dialect.Names(role), ", ")+", or the path of a file of your own that ends in .toml")
	default:
		t.Fail("dialect", err.Error())
	}
}
