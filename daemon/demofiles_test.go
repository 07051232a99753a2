package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightbench/daemon/app"
	"nightbench/instruments/bench"
	"nightbench/sweeps"
	"nightbench/sweeps/example"
)

// What demo wrote it may write again; what a person put there stays, byte by byte.
func TestDemoLeavesWhatIsNotItsOwn(t *testing.T) {
	dir := t.TempDir()
	for range 2 {
		files, err := demoFiles(dir)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := sweeps.ReadBoard(filepath.Join(files, example.BoardPump)); err != nil {
			t.Error(err)
		}
		if _, err := bench.Read(filepath.Join(files, example.Bench)); err != nil {
			t.Error(err)
		}
	}
	for _, path := range []string{"bench.toml", "files/sample.toml", "files/night.toml", "files/old/night.toml"} {
		dir := t.TempDir()
		if !strings.HasPrefix(path, "files/s") {
			if _, err := demoFiles(dir); err != nil { // the rest is the demo's own
				t.Fatal(err)
			}
		}
		own := filepath.Join(dir, path)
		if err := os.MkdirAll(filepath.Dir(own), 0o700); err != nil {
			t.Fatal(err)
		}
		const text = "# my own\n"
		if err := os.WriteFile(own, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		if _, err := demoFiles(dir); err == nil || !strings.Contains(err.Error(), "was not written by demo") || !strings.Contains(err.Error(), "--state DIR") {
			t.Errorf("%s: %v", path, err)
		}
		if got, err := os.ReadFile(own); err != nil || string(got) != text {
			t.Errorf("%s is %q now, %v", path, got, err)
		}
	}
}

// A folder that another daemon holds is left as it is: files, bench file and energised record.
func TestDemoTouchesNoFolderThatIsHeld(t *testing.T) {
	dir := t.TempDir()
	held, err := app.OpenState(dir)
	if err != nil {
		t.Fatal(err)
	}
	defer held.Close()
	files, err := demoFiles(dir)
	if err != nil {
		t.Fatal(err)
	}
	keep := map[string]string{
		filepath.Join(files, example.Sample): demoMark + "\n# in use\n",
		filepath.Join(dir, "bench.toml"):     demoMark + "\n# in use\n",
		filepath.Join(dir, "energised.json"): `{"address":"serial:///dev/pts/1","practice":true}`,
	}
	for path, text := range keep {
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	for _, flag := range []string{"--bench-only", "--once"} {
		if out, status := once(t, "demo", flag, "--state", dir); status == 0 || !strings.Contains(out, "another nightbench holds this state folder") {
			t.Errorf("%s: status %d, %q", flag, status, out)
		}
	}
	for path, text := range keep {
		if got, err := os.ReadFile(path); err != nil || string(got) != text {
			t.Errorf("%s is %q now, %v", path, got, err)
		}
	}
}
