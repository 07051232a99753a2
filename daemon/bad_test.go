package main

import (
	"net"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"nightbench/daemon/app"
)

// badFolder has files with one mistake each, named for it; which line and key is told is tested in sweeps.
const badFolder = "../testdata/bad"

// wholeFile are the bad files whose mistake has no line.
var wholeFile = map[string]bool{"empty.plan.toml": true}

// TestBadFilesEndTheCommand gives every bad file to the command that reads its
// kind: status 2, one message with file and line, no port and no database opened.
func TestBadFilesEndTheCommand(t *testing.T) {
	entries, err := os.ReadDir(badFolder)
	if err != nil {
		t.Fatal(err)
	}
	taken, err := net.Listen("tcp", "127.0.0.1:0") // serve would complain, if it came so far as to open its page there
	if err != nil {
		t.Fatal(err)
	}
	defer taken.Close()
	seen := map[string]int{}
	for _, e := range entries {
		path, state := filepath.Join(badFolder, e.Name()), filepath.Join(t.TempDir(), "state")
		kind, args := readBy(t, path, taken.Addr().String())
		seen[kind]++
		t.Run(e.Name(), func(t *testing.T) {
			out, status := once(t, append(args, "--state", state)...)
			if status != exitUsage {
				t.Errorf("status %d, want %d", status, exitUsage)
			}
			place := regexp.QuoteMeta(path) + `:\d+: `
			if wholeFile[e.Name()] {
				place = regexp.QuoteMeta(path) + ": "
			}
			out = strings.TrimPrefix(out, cautions+"\n\n") // serve prints them first
			if !regexp.MustCompile(`^nightbench: `+place+`\S`).MatchString(out) || strings.Contains(out, "\n") {
				t.Errorf("want one line that begins with file and line, got:\n%s", out)
			}
			if _, err := os.Stat(app.Database(state)); err == nil {
				t.Error("the database was opened")
			}
		})
	}
	for _, kind := range []string{"board", "plan", "bench"} {
		if seen[kind] < 5 {
			t.Errorf("%d bad files of kind %s, want 5 or more", seen[kind], kind)
		}
	}
}

// readBy is the command line that reads a file of the kind that its name says.
func readBy(t *testing.T, path, listen string) (kind string, args []string) {
	t.Helper()
	switch {
	case strings.HasSuffix(path, ".board.toml"):
		return "board", []string{"predict", path, "--supply", "9V", "--pot", "10k"}
	case strings.HasSuffix(path, ".plan.toml"):
		return "plan", []string{"rehearse", path, "--bench", "../sweeps/example/bench.toml"}
	case strings.HasSuffix(path, ".bench.toml"):
		return "bench", []string{"serve", path, "--listen", listen}
	}
	t.Fatalf("%s: a bad file's name ends in .bench.toml, .board.toml or .plan.toml", path)
	return "", nil
}
