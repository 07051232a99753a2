package bench

import (
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
	if _, err := dialect.Find(dialect.Role(kind), ownFile(name, r.file.Name)); err != nil {
		t.Fail("dialect", err.Error())
	}
}
