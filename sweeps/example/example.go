// Package example is the set of starter files: a bench, two driver boards for
// the dosing pumps of hydroponic growers, and two plans.
package example

import (
	"embed"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

//go:embed *.toml
var files embed.FS

// Names of the files.
const (
	Bench      = "bench.toml"
	BoardPump  = "pump-driver-b.toml"
	BoardPlain = "pump-driver-a.toml"
	Sample     = "sample.toml"    // the plan of the demonstration
	Overnight  = "overnight.toml" // a whole night, with warm-up
)

// FS holds the files.
func FS() fs.FS { return files }

// Names lists the files, sorted.
func Names() []string {
	entries, err := files.ReadDir(".")
	if err != nil {
		panic(err) // the folder is part of the program
	}
	names := make([]string, len(entries))
	for i, e := range entries {
		names[i] = e.Name()
	}
	return names
}

// Text is the text of one file; empty for a name that is none.
func Text(name string) string {
	b, err := files.ReadFile(name)
	if err != nil {
		return ""
	}
	return string(b)
}

// Write writes the files into a folder, which it makes where needed. It
// overwrites nothing: if one of the files is there already, none is written.
func Write(dir string) error {
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return fmt.Errorf("write the example files: %w", err)
	}
	for _, name := range Names() {
		path := filepath.Join(dir, name)
		if _, err := os.Lstat(path); !errors.Is(err, fs.ErrNotExist) {
			return fmt.Errorf("write the example files: %s is there already and is not overwritten: give another folder, or move it away", path)
		}
	}
	for _, name := range Names() {
		if err := writeNew(filepath.Join(dir, name), Text(name)); err != nil {
			return fmt.Errorf("write the example files: %w", err)
		}
	}
	return nil
}

// writeNew writes a file that must not exist yet.
func writeNew(path, text string) error {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if err != nil {
		return err
	}
	_, err = f.WriteString(text)
	return errors.Join(err, f.Close())
}
