package main

import (
	"encoding/json"
	"os/exec"
	"slices"
	"strings"
	"testing"
)

// The order of the house: a package may import packages of its own line and of
// the lines above it that are named. What a line does not name it may not import.
var edges = map[string][]string{
	"instruments/si":                {},
	"instruments/userfile":          {},
	"sweeps/uncertainty":            {},
	"sweeps/internal/numeric":       {},
	"migrations":                    {},
	"ui":                            {},
	"instruments/conformance":       {},
	"instruments/practice/circuit":  {},
	"instruments":                   {"instruments/si"},
	"instruments/link":              {"instruments", "instruments/si"},
	"instruments/link/exchange":     {"instruments/link"},
	"instruments/link/linktest":     {"instruments/link", "instruments/link/exchange"},
	"instruments/scpi":              {"instruments", "instruments/si", "instruments/link"},
	"instruments/dialect":           {"instruments", "instruments/si", "instruments/userfile", "instruments/link", "instruments/scpi"},
	"instruments/driver":            {"instruments", "instruments/si", "instruments/link", "instruments/scpi", "instruments/dialect"},
	"instruments/driver/drivertest": {"instruments", "instruments/si", "instruments/link", "instruments/scpi"},
	"instruments/bench":             {"instruments", "instruments/si", "instruments/userfile", "instruments/link", "instruments/scpi", "instruments/dialect", "instruments/driver"},
	"instruments/discover":          {"instruments", "instruments/link", "instruments/scpi", "instruments/dialect"},
	"instruments/practice":          {"instruments", "instruments/si", "instruments/scpi", "instruments/practice/circuit"},
	"sweeps":                        {"instruments", "instruments/si", "instruments/userfile"},
	"sweeps/example":                {},
	"sweeps/predict":                {"instruments", "instruments/si", "instruments/userfile", "sweeps", "sweeps/uncertainty", "sweeps/internal/numeric"},
	"sweeps/pulse":                  {"instruments", "instruments/si", "sweeps", "sweeps/uncertainty", "sweeps/internal/numeric"},
	"sweeps/pulse/capture":          {"instruments/si", "sweeps/pulse"},
	"sweeps/pulse/figure":           {"instruments/si", "sweeps/pulse"},
	"sweeps/derive":                 {"instruments", "instruments/si", "sweeps", "sweeps/uncertainty", "sweeps/pulse"},
	"sweeps/schedule":               {"instruments", "instruments/si", "sweeps"},
	"sweeps/runner":                 {"instruments", "instruments/si", "sweeps", "sweeps/derive", "sweeps/schedule"},
	"daemon/store":                  {"instruments", "instruments/si", "sweeps", "migrations"},
	"daemon/web":                    {"instruments", "instruments/si", "sweeps", "daemon/store"},
	"daemon/app": {
		"instruments", "instruments/si", "instruments/userfile", "instruments/bench", "instruments/scpi", "instruments/practice", "instruments/practice/circuit",
		"sweeps", "sweeps/predict", "sweeps/schedule", "sweeps/runner", "daemon/store", "daemon/web", "ui",
	},
	"daemon": {
		"instruments", "instruments/si", "instruments/userfile", "instruments/link", "instruments/link/exchange", "instruments/scpi", "instruments/dialect",
		"instruments/discover", "instruments/bench", "sweeps", "sweeps/example", "sweeps/predict", "sweeps/runner",
		"sweeps/pulse", "sweeps/pulse/capture", "sweeps/pulse/figure", "daemon/app", "daemon/service", "daemon/store", "daemon/web",
	},
	"daemon/service": {},
}

func TestImportsRunOneWay(t *testing.T) {
	out, err := exec.Command("go", "list", "-json=ImportPath,Imports", "nightbench/...").Output()
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]bool{}
	for d := json.NewDecoder(strings.NewReader(string(out))); d.More(); {
		var p struct {
			ImportPath string
			Imports    []string
		}
		if err := d.Decode(&p); err != nil {
			t.Fatal(err)
		}
		name := strings.TrimPrefix(p.ImportPath, "nightbench/")
		allowed, known := edges[name]
		seen[name] = true
		if !known {
			t.Errorf("%s is a new room: say in this table what it may import", name)
		}
		for _, i := range p.Imports {
			to, ours := strings.CutPrefix(i, "nightbench/")
			if ours && !slices.Contains(allowed, to) {
				t.Errorf("%s imports %s, which its line does not allow", name, to)
			}
		}
	}
	for name := range edges {
		if !seen[name] {
			t.Errorf("%s stands in the table but is no package", name)
		}
	}
}

// What may lie at the top; everything else lives inside a room.
var top = []string{
	"daemon", "instruments", "sweeps", "ui", "migrations", "testdata", "go.mod", "go.sum", "README.md", "DEVELOPERS.md", "CHANGELOG.md", "LICENSE", "Makefile",
}

func TestTopLevelListing(t *testing.T) {
	out, err := exec.Command("git", "-C", "..", "ls-files").Output()
	if err != nil {
		t.Fatal(err)
	}
	found := map[string]bool{}
	for path := range strings.Lines(string(out)) {
		name, _, _ := strings.Cut(strings.TrimSpace(path), "/")
		found[name] = true
		if !strings.HasPrefix(name, ".") && !slices.Contains(top, name) {
			t.Errorf("%s lies at the top level: it belongs into a room", name)
		}
	}
	for _, name := range top {
		if !found[name] {
			t.Errorf("%s is missing at the top level", name)
		}
	}
}
