package ui

import (
	"io/fs"
	"regexp"
	"testing"
)

var (
	asked     = regexp.MustCompile(`(?:src|href)="/([^"]+)"`)
	elsewhere = regexp.MustCompile(`(?:src|href)="(?:[a-z]+:)?//`)
)

// The marker is there with and without a built page: Go builds from a clone without Node.
func TestPageIsRootedAtDist(t *testing.T) {
	if _, err := fs.Stat(Page(), ".keep"); err != nil {
		t.Error(err)
	}
}

// A page that was built is whole: what index.html asks for is there, and nothing of it comes from elsewhere.
func TestABuiltPageHasItsParts(t *testing.T) {
	index, err := fs.ReadFile(Page(), "index.html")
	if err != nil {
		t.Logf("the page is not built: %v", err)
		return
	}
	found := asked.FindAllSubmatch(index, -1)
	if len(found) == 0 {
		t.Error("index.html asks for nothing")
	}
	for _, m := range found {
		if _, err := fs.Stat(Page(), string(m[1])); err != nil {
			t.Errorf("index.html asks for /%s: %v", m[1], err)
		}
	}
	if elsewhere.Match(index) {
		t.Error("index.html loads something from elsewhere")
	}
}
