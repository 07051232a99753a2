package dialect

import (
	"flag"
	"os"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write the README's table of dialects anew")

// The README's table is made of the files: it can't say less than they do.
func TestTableOfTheReadme(t *testing.T) {
	const path, begin, end = "../../README.md", "<!-- dialects: made by go test ./instruments/dialect -run TestTableOfTheReadme -update -->\n", "<!-- dialects end -->"
	all, err := ofProgram()
	if err != nil {
		t.Fatal(err)
	}
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	head, rest, found := strings.Cut(string(text), begin)
	found2, tail, closed := strings.Cut(rest, end)
	if !found || !closed {
		t.Fatalf("%s has no place for the table between %q and %q", path, begin, end)
	}
	table := Table(all, RoleSupply, RoleMeter, RoleScope, RolePot, RoleCutoff, RoleProbe)
	if *update {
		if err := os.WriteFile(path, []byte(head+begin+table+end+tail), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	if found2 != table {
		t.Errorf("the table in %s is not that of the files; run: go test ./instruments/dialect -run TestTableOfTheReadme -update", path)
	}
}

// A row says what a reader must know before trusting a dialect.
func TestRowOfTheTable(t *testing.T) {
	d := mustFind(t, RoleSupply, "gwinstek-gpd")
	for _, want := range []string{"`gwinstek-gpd`", "S22 GW Instek GPD-3303", "output, voltage, current_limit", "never"} {
		if got := Table([]*Dialect{d}, RoleSupply); !strings.Contains(got, want) {
			t.Errorf("%q is not in %s", want, got)
		}
	}
}
