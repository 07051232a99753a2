package userfile_test

import (
	"fmt"
	"strings"
	"testing"

	"nightbench/instruments/userfile"
)

func TestUnknownKeysNameWhatIsAccepted(t *testing.T) {
	f := parse(t, "[supply]\nmax_volage = \"13 V\"\ncolour = \"red\"\n[suply2]\nx = 1\n")
	var s string
	sup := f.Table("supply")
	sup.String("max_voltage", &s)
	sup.Optional().String("fuse", &s)
	lines := strings.Split(f.Err().Error(), "\n")
	want := []string{
		`f.toml:2: supply.max_volage = "13 V": unknown key; did you mean "max_voltage"? (accepted here: fuse, max_voltage); the line would be: max_voltage = "13 V"`,
		`f.toml:3: supply.colour = "red": unknown key (accepted here: fuse, max_voltage)`,
		`f.toml:4: suply2: unknown table; did you mean "supply"? (accepted here: supply)`,
	}
	if strings.Join(lines, "\n") != strings.Join(want, "\n") {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(lines, "\n"), strings.Join(want, "\n"))
	}
}

func TestAMisspeltKeyIsNotMissingToo(t *testing.T) {
	f := parse(t, "[pln]\nname = \"x\"\n")
	f.Table("plan")
	if err := f.Err(); err == nil || strings.Contains(err.Error(), "missing") || !strings.Contains(err.Error(), `did you mean "plan"?`) {
		t.Errorf("got %v", err)
	}
}

func TestRefusedKeysAreNotAccepted(t *testing.T) {
	f := parse(t, "a = 1\nb = 2\nc = 3\n")
	var n int
	f.Int("a", &n, 0, 9)
	if !f.Refuse("b", "no use for it") || f.NotYet("d", "leave it out") {
		t.Error("refused what isn't there, or took what is")
	}
	want := "f.toml:2: b = 2: no use for it\nf.toml:3: c = 3: unknown key (accepted here: a)"
	if err := f.Err(); err == nil || err.Error() != want {
		t.Errorf("got  %v\nwant %s", err, want)
	}
}

func TestTheSameTableIsHandedOutOnce(t *testing.T) {
	f := parse(t, "[[m]]\na = 1\nb = 2\n")
	var n int
	f.Tables("m")[0].Int("a", &n, 0, 9)
	f.Optional().Tables("m")[0].Int("b", &n, 0, 9)
	if err := f.Err(); err != nil {
		t.Error(err)
	}
}

func TestLookOnlyLooks(t *testing.T) {
	f := parse(t, "[plan]\n\n[[axis]]\n[[axis]]\nvalues = [1]\n")
	f.Look("axis", 1).Fail("values", "too many")
	f.Look("axis", 7).Fail("values", "not there")
	f.Look("none").Fail("", "not there either")
	want := "f.toml:1: axis[8].values: not there\nf.toml:1: none: not there either\nf.toml:5: axis[2].values = [1]: too many"
	if err := f.Failed(); err == nil || err.Error() != want {
		t.Errorf("got  %v\nwant %s", err, want)
	}
}

func TestReopenOfNoTextHasNoLines(t *testing.T) {
	f := userfile.Reopen("plan.toml", "")
	f.Look("plan").Fail("board", "is wrong")
	if err := f.Failed(); err == nil || err.Error() != "plan.toml: plan.board: is wrong" {
		t.Errorf("got %v", err)
	}
}

func TestFoundIsBoundedAndPrintable(t *testing.T) {
	f := parse(t, "k = \"\"\"a\n\tb\u200b"+strings.Repeat("x", 200)+"\"\"\"\n")
	err := f.Err().Error()
	if strings.ContainsAny(err, "\n\t\u200b") || len(err) > 200 {
		t.Errorf("got %q", err)
	}
}

func TestAWrongFileIsToldShortly(t *testing.T) {
	f := parse(t, strings.Repeat("k", 3)+" = { "+manyKeys(20_000)+" }\n")
	f.Optional().Table("kkk")
	lines := strings.Split(f.Err().Error(), "\n")
	if len(lines) != 21 || lines[20] != "f.toml: and 19980 more" {
		t.Errorf("%d lines, the last %q", len(lines), lines[len(lines)-1])
	}
}

func manyKeys(n int) string {
	keys := make([]string, n)
	for i := range keys {
		keys[i] = fmt.Sprintf("k%d = 1", i)
	}
	return strings.Join(keys, ", ")
}

func TestNearest(t *testing.T) {
	for _, c := range []struct{ word, want string }{
		{"max_volage", "max_voltage"}, {"max_votlage", "max_voltage"}, {"Max_Voltage", "max_voltage"},
		{"max", ""}, {"", ""}, {"load_l", "load_lo"}, {"load_", ""}, // two are equally near
		{strings.Repeat("x", 5000), ""},
	} {
		if got := userfile.Nearest(c.word, []string{"max_voltage", "load_hi", "load_lo"}); got != c.want {
			t.Errorf("nearest to %.20q is %q, want %q", c.word, got, c.want)
		}
	}
}
