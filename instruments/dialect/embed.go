package dialect

import (
	"embed"
	"fmt"
	"io/fs"
	"slices"
	"strings"
	"sync"

	"nightbench/instruments/userfile"
)

//go:embed files/*.toml
var files embed.FS

// ofProgram reads the dialects that come with the program, by name.
var ofProgram = sync.OnceValues(func() ([]*Dialect, error) {
	names, err := fs.Glob(files, "files/*.toml")
	if err != nil {
		return nil, err
	}
	var all []*Dialect
	for _, name := range names {
		text, err := files.ReadFile(name)
		if err != nil {
			return nil, err
		}
		d, err := Parse(name, text)
		if err != nil {
			return nil, err
		}
		all = append(all, d)
	}
	return all, nil
})

// All are the user's own dialects, which are asked first who they know, and
// those that come with the program.
func All() ([]*Dialect, error) {
	ours, err := ofProgram()
	own, _ := Own()
	return slices.Concat(own, ours), err
}

// Names are the names of all dialects, those of one role, or with an empty role all.
func Names(role Role) (names []string) {
	all, _ := All() // a file of ours that can't be read fails every test of this package
	for _, d := range all {
		if role == "" || d.Head.Role == role {
			names = append(names, d.Head.Name)
		}
	}
	return names
}

// Find gives the dialect of a role by name. A name that ends in .toml is the
// path of the user's own file.
func Find(role Role, name string) (*Dialect, error) {
	if strings.HasSuffix(name, ".toml") {
		d, err := ReadFile(name)
		if err != nil {
			return nil, err
		}
		return d, d.serves(role)
	}
	all, err := All()
	if err != nil {
		return nil, err
	}
	for _, d := range all {
		if d.Head.Name == name {
			return d, d.serves(role)
		}
	}
	if err := brokenOwn(name); err != nil {
		return nil, err
	}
	hint := ""
	if near := userfile.Nearest(name, Names(role)); near != "" {
		hint = fmt.Sprintf(" (did you mean %q?)", near)
	}
	return nil, fmt.Errorf("%w %q%s; use auto, %s, or the path of a file of your own that ends in .toml",
		ErrUnknown, name, hint, strings.Join(Names(role), ", "))
}

// serves refuses a dialect of another role.
func (d *Dialect) serves(role Role) error {
	if d.Head.Role == role {
		return nil
	}
	return fmt.Errorf("dialect %s is for a %s, not for a %s; use one of %s",
		d.Head.Name, d.Head.Role, role, strings.Join(Names(role), ", "))
}
