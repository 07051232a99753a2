package userfile_test

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightbench/instruments/userfile"
)

func TestReadRefusesWhatIsNoFile(t *testing.T) {
	dir := t.TempDir()
	for _, c := range []struct{ name, path, want string }{
		{"not there", filepath.Join(dir, "none.toml"), "no such file"},
		{"folder", dir, "is a folder"},
		{"device", os.DevNull, "is no ordinary file"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := userfile.Read(c.path)
			var e *userfile.Error
			if !errors.As(err, &e) || e.File != c.path || !strings.Contains(e.Want, c.want) {
				t.Fatalf("got %v, want %q about %s", err, c.want, c.path)
			}
		})
	}
	if _, err := userfile.Read(filepath.Join(dir, "none.toml")); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("%v is not fs.ErrNotExist", err)
	}
}

func TestReadIsBounded(t *testing.T) {
	path := filepath.Join(t.TempDir(), "huge.toml")
	if err := os.WriteFile(path, []byte(strings.Repeat("#", userfile.MaxSize)+"\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	if _, err := userfile.Read(path); err == nil || !strings.Contains(err.Error(), "larger than 1 MB") {
		t.Errorf("got %v", err)
	}
	deep := "a = " + strings.Repeat("[", 400) + strings.Repeat("]", 400)
	if _, err := userfile.Parse("deep.toml", []byte(deep)); err == nil || !strings.Contains(err.Error(), "deep.toml:1: a: nested more than 16 deep") {
		t.Errorf("got %v", err)
	}
}

// Each is a document that TOML 1.0 (toml.io/en/v1.0.0) forbids, with the line of the mistake.
func TestFormIsRefused(t *testing.T) {
	for _, c := range []struct{ name, text, want string }{
		{"Empty", " \n\t\n", "f.toml: is empty"},
		{"ByteOrderMark", "\xef\xbb\xbfa = 1", "f.toml:1: begins with a byte order mark"},
		{"UTF16", "\xff\xfea\x00", "f.toml:1: is UTF-16"},
		{"Latin1", "a = 1\nb = \"\xe4\"", "f.toml:2: byte 0xe4 is not UTF-8"},
		{"KeyTwice", "a = 1\n\na = 2", "f.toml:3: a = 2: already given on line 1"},
		{"KeyTwiceInTable", "[t]\na = 1\na = 2", "f.toml:3: t.a = 2: already given on line 2"},
		{"KeyTwiceInBraces", "t = { a = 1, a = 2 }", "f.toml:1: t.a = 2: already given on line 1"},
		{"TableTwice", "[t]\n[u]\n[t]", "f.toml:3: t: already given on line 1"},
		{"TableThenArray", "[t]\n[[t]]", "f.toml:2: t: already given on line 1"},
		{"ArrayThenTable", "[[t]]\n[t]", "f.toml:2: t: already given on line 1"},
		{"BracesThenTable", "t = {}\n[t]", "f.toml:2: t: already given on line 1"},
		{"BracesExtended", "t = {}\n[t.u]", "f.toml:2: t: already given on line 1"},
		{"ListExtended", "t = [1]\n[[t]]", "f.toml:2: t: already given on line 1"},
		{"DotsIntoValue", "t = 1\nt.a = 2", "f.toml:2: t: already given on line 1"},
		{"DotsThenTable", "t.a = 2\n[t]", "f.toml:2: t: already given on line 1"},
		{"DotsIntoTable", "[t.u]\n[t]\nu.a = 1", "f.toml:3: t.u: already given on line 1"},
		{"SecondElement", "[[t]]\n[[t]]\na = 1\na = 1", "f.toml:4: t[2].a = 1: already given on line 3"},
		{"NoValue", "[t]\nb = \n", "f.toml:2: "},
		{"NoQuotes", "[t]\nb = 13 V # volts", `f.toml:2: t.b = 13 V: text and quantities stand in quotes; the line would be: b = "13 V"`},
		{"NoClosing", "[t\nb = 1", "f.toml:1: "},
		{"NoEnd", "a = \"x", "f.toml:1: "},
		{"LoneReturn", "a = 1\rb = 2", "f.toml:1: "},
		{"Control", "a = \"\x01\"", "f.toml:1: "},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := userfile.Parse("f.toml", []byte(c.text))
			var e *userfile.Error
			if !errors.As(err, &e) || !strings.HasPrefix(err.Error(), c.want) {
				t.Fatalf("got  %v\nwant %s", err, c.want)
			}
		})
	}
}

// Documents that TOML 1.0 allows, some in the specification's own words ("Table").
func TestFormIsAccepted(t *testing.T) {
	for _, c := range []struct{ name, text string }{
		{"SuperTableLater", "[x.y.z.w]\n[x]"},
		{"SubTableOfDots", "[fruit]\napple.color = \"red\"\napple.taste.sweet = true\n[fruit.apple.texture]\nsmooth = true"},
		{"QuotedKeys", "\"a b\".'c' = 1"},
		{"SubTableOfElement", "[[t]]\n[t.u]\na = 1\n[[t]]\n[t.u]\na = 2"},
		{"Comment", "# only a comment"},
		{"ListOverLines", "a = [\n 1, # one\n 2,\n]"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if _, err := userfile.Parse("f.toml", []byte(c.text)); err != nil {
				t.Fatal(err)
			}
		})
	}
}

// Files saved on Windows end their lines with CR LF; TOML 1.0 allows that, and lines count the same.
func TestLinesEndingInCRLFCountTheSame(t *testing.T) {
	f, err := userfile.Parse("f.toml", []byte("[t]\r\na = \"x\"\r\n\r\nb = 1\r\n"))
	if err != nil {
		t.Fatal(err)
	}
	var a string
	f.Table("t").String("a", &a)
	if a != "x" {
		t.Errorf("a is %q", a)
	}
	if err := f.Err(); err == nil || !strings.HasPrefix(err.Error(), "f.toml:4: t.b = 1: unknown key") {
		t.Errorf("got %v", err)
	}
}
