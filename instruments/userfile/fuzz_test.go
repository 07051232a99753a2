package userfile_test

import (
	"strings"
	"testing"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// FuzzParse: whatever the bytes, reading ends, without a panic, and every
// mistake is one printable line that names the file.
func FuzzParse(f *testing.F) {
	for _, s := range []string{
		"a = 1", "[t]\na.b = { c = [1, \"x\"] }", "[[m]]\n[m.n]\n[[m]]", "a = 13 V", "a = \"\"\"x\n\"\"\"", "a = 2026-03-01T", "\xff", "[a.b]\n[a]\nb.c = 1",
		"[[a.b]]\n[a.b.c]", "a = nan", "a = 0x", "a=[[],[[]]]", "[a]\n[[a.b]]\n[a.b.c]\nd=1", "a = \"\\u0000\"", "'' = 1", "[\"\"]\na=1",
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		file, err := userfile.Parse("f.toml", data)
		if err == nil {
			askEverything(file.Root(), 0)
			err = file.Err()
		}
		if err == nil {
			return
		}
		for line := range strings.Lines(err.Error()) {
			if !strings.HasPrefix(line, "f.toml") {
				t.Errorf("a mistake that names no file: %q", line)
			}
		}
	})
}

func askEverything(t *userfile.Table, depth int) {
	var (
		s  string
		n  int
		x  float64
		b  bool
		v  si.TolVoltage
		ss []string
		ns []int
		vs []si.Limit
	)
	for _, k := range t.Keys() {
		t.String(k, &s)
		t.Int(k, &n, 0, 9)
		t.Number(k, &x)
		t.Bool(k, &b)
		t.Date(k, &s)
		t.Text(k, &v)
		t.Strings(k, &ss)
		t.Ints(k, &ns, 0, 9)
		userfile.Texts(t, k, &vs)
		userfile.Pairs(t, k, func(si.Current, si.Voltage) {})
		userfile.Word(t, k, &s, "up", "down")
		t.Suggest(k, "upp", []string{"up"}, "x")
		if depth < 4 {
			askEverything(t.Table(k), depth+1)
			for _, sub := range t.Tables(k) {
				askEverything(sub, depth+1)
			}
		}
	}
}
