package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"nightbench/sweeps/example"
)

// demoMark is the first line of every file that demo writes. The bench file has it
// too, since it is the example's text.
const demoMark = "# Written by nightbench demo, and anew at each of its starts: keep what is yours elsewhere."

// demoFiles lays the example set into the demo's state folder, fresh each time. What
// is there already and not the demo's own is left alone, and refused.
func demoFiles(dir string) (string, error) {
	files := filepath.Join(dir, "files")
	if err := ownAll(dir, files); err != nil {
		return "", err
	}
	if err := os.RemoveAll(files); err != nil {
		return "", err
	}
	if err := os.MkdirAll(files, 0o755); err != nil {
		return "", err
	}
	for _, name := range example.Names() {
		if err := os.WriteFile(filepath.Join(files, name), []byte(demoMark+"\n"+example.Text(name)), 0o644); err != nil {
			return "", err
		}
	}
	return files, nil
}

// ownAll refuses a state folder with files that demo would write over or remove and did not write.
func ownAll(dir, files string) error {
	paths := []string{filepath.Join(dir, "bench.toml")}
	entries, err := os.ReadDir(files)
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	for _, e := range entries {
		path := filepath.Join(files, e.Name())
		if !e.Type().IsRegular() || !slices.Contains(example.Names(), e.Name()) {
			return notOwn(path)
		}
		paths = append(paths, path)
	}
	for _, path := range paths {
		text, err := os.ReadFile(path)
		switch {
		case errors.Is(err, fs.ErrNotExist):
		case err != nil:
			return err
		case !strings.HasPrefix(string(text), demoMark):
			return notOwn(path)
		}
	}
	return nil
}

func notOwn(path string) error {
	return fmt.Errorf("%s was not written by demo, which would remove it or write over it: move it away, or name another folder with --state DIR", path)
}
