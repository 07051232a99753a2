package dialect

import (
	"cmp"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"

	"nightbench/instruments/userfile"
)

// folder is the user's own dialects. It is set once, when the program starts.
var folder struct {
	sync.Mutex
	own    []*Dialect
	broken []error
}

// Folder is where a user's own dialects lie when nothing else is said:
// nightbench/dialects in the XDG configuration folder.
func Folder() (string, error) {
	base, err := os.UserConfigDir()
	if err != nil {
		return "", err
	}
	return filepath.Join(base, "nightbench", "dialects"), nil
}

// UseFolder reads all dialects of a folder of the user's own; one that is not
// there holds none. Files with mistakes are left out and their mistakes
// returned: they hinder nobody who does not need them. A name that is taken
// already is a mistake too, since a bench file could mean either.
func UseFolder(path string) (mistakes []error) {
	names, err := filepath.Glob(filepath.Join(path, "*.toml"))
	if err != nil {
		return []error{fmt.Errorf("folder of dialects %s: %w", path, err)}
	}
	if _, err := os.Stat(path); err != nil && !errors.Is(err, fs.ErrNotExist) {
		return []error{fmt.Errorf("folder of dialects: %w", err)}
	}
	ours, _ := ofProgram() // its own mistakes fail every test of this package
	var own []*Dialect
	for _, name := range names {
		d, err := ReadFile(name)
		if err == nil {
			err = d.taken(slices.Concat(ours, own))
		}
		if err != nil {
			mistakes = append(mistakes, err)
			continue
		}
		own = append(own, d)
	}
	folder.Lock()
	defer folder.Unlock()
	folder.own, folder.broken = own, mistakes
	return mistakes
}

// taken refuses a name that another dialect has.
func (d *Dialect) taken(others []*Dialect) error {
	for _, o := range others {
		if o.Head.Name == d.Head.Name {
			return fmt.Errorf("%s: the name %q is taken by the dialect %s; give yours another",
				d.Path, d.Head.Name, cmp.Or(o.Path, "that comes with the program"))
		}
	}
	return nil
}

// ReadFile reads one dialect file of the user's own.
func ReadFile(path string) (*Dialect, error) {
	f, err := userfile.Read(path)
	if err != nil {
		return nil, err
	}
	d, err := read(f)
	if err != nil {
		return nil, err
	}
	if abs, err := filepath.Abs(path); err == nil {
		path = abs
	}
	d.Path = path
	return d, nil
}

// Own are the dialects of the user's folder, and what was wrong with others in it.
func Own() ([]*Dialect, []error) {
	folder.Lock()
	defer folder.Unlock()
	return slices.Clone(folder.own), slices.Clone(folder.broken)
}

// brokenOwn tells the mistakes of the file in the user's folder that would bear a name.
func brokenOwn(name string) error {
	_, broken := Own()
	for _, err := range broken {
		if strings.Contains(err.Error(), string(filepath.Separator)+name+".toml") {
			return fmt.Errorf("the dialect in your folder has mistakes: %w", err)
		}
	}
	return nil
}
