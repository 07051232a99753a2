package dialect

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightbench/instruments"
)

// ownFolder makes a folder of one's own dialects and uses it until the test ends.
func ownFolder(t *testing.T, files map[string]string) (mistakes []error) {
	t.Helper()
	dir := t.TempDir()
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	t.Cleanup(func() { UseFolder(filepath.Join(dir, "none")) })
	return UseFolder(dir)
}

func renamed(t *testing.T, name string) string {
	return strings.NewReplacer(`"nightbench-pot"`, `"`+name+`"`, `model = "pot-bridge*"`, `model = "own-bridge*"`).Replace(mustFind(t, RolePot, "nightbench-pot").Text)
}

func TestFolderOfOnesOwn(t *testing.T) {
	good := renamed(t, "own-pot")
	mistakes := ownFolder(t, map[string]string{
		"own-pot.toml": good,
		"broken.toml":  strings.Replace(renamed(t, "broken"), `role = "pot"`, `role = "jug"`, 1),
		"taken.toml":   renamed(t, "nightbench-pot"),
		"twice.toml":   good,
		"notes.txt":    "not a dialect",
	})
	if len(mistakes) != 3 {
		t.Errorf("mistakes: %v", mistakes)
	}
	d := mustFind(t, RolePot, "own-pot")
	if filepath.Base(d.Path) != "own-pot.toml" {
		t.Errorf("found at %q", d.Path)
	}
	all, err := All()
	if err != nil {
		t.Fatal(err)
	}
	if m, ok := Match(all, instruments.Identity{Maker: "Nightbench", Model: "own-bridge 2"}); !ok || m.Head.Name != "own-pot" {
		t.Errorf("by identity: %v", m)
	}
	if _, err := Find(RolePot, "broken"); err == nil || !strings.Contains(err.Error(), "broken.toml:") || errors.Is(err, ErrUnknown) {
		t.Errorf("a broken one by name: %v", err)
	}
}

func TestNoFolderOfOnesOwn(t *testing.T) {
	if mistakes := UseFolder(filepath.Join(t.TempDir(), "none")); len(mistakes) != 0 {
		t.Errorf("a folder that is not there: %v", mistakes)
	}
	if own, broken := Own(); len(own)+len(broken) != 0 {
		t.Errorf("%v, %v", own, broken)
	}
	file := filepath.Join(t.TempDir(), "own-pot.toml")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	t.Setenv("XDG_CONFIG_HOME", "/etc/bench")
	if got, err := Folder(); err != nil || got != "/etc/bench/nightbench/dialects" {
		t.Errorf("%q, %v", got, err)
	}
}
