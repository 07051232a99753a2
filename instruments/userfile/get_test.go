package userfile_test

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
	"testing"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

func parse(t testing.TB, text string) *userfile.File {
	t.Helper()
	f, err := userfile.Parse("f.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func TestGettersReadWhatIsThere(t *testing.T) {
	f := parse(t, `
name = "Bench 2"
count = 1_000
share = 2.5e-1
on = true
day = 2026-03-01
day2 = "2026-03-02"
volts = "9 V"
ohms = 4_700
tol = "4k7 1%"
words = ["a", "b"]
codes = [0, 0x10, 256]
supplies = ["5 V", "9 V"]
rows = [["10 mA", "1.4 V"], ["100 mA", "1.7 V"]]
way = "up"
[in]
a = { b = { c = "1 s" } }
[[m]]
n = 1
[[m]]
n = 2
`)
	type all struct {
		Name, Day, Day2, Way string
		Count                int
		Share                float64
		On                   bool
		Volts, Ohms, Tol, C  float64
		Words                []string
		Codes, Ns            []int
		Supplies, Rows       []float64
	}
	var got all
	var v si.Voltage
	var r si.Resistance
	var tol si.TolResistance
	var c si.Time
	var list []si.Voltage
	f.String("name", &got.Name)
	f.Int("count", &got.Count, 0, 5000)
	f.Number("share", &got.Share)
	f.Bool("on", &got.On)
	f.Date("day", &got.Day)
	f.Date("day2", &got.Day2)
	f.Text("volts", &v)
	f.Text("ohms", &r)
	f.Text("tol", &tol)
	f.Strings("words", &got.Words)
	f.Ints("codes", &got.Codes, 0, 256)
	userfile.Texts(f.Root(), "supplies", &list)
	userfile.Pairs(f.Root(), "rows", func(i si.Current, u si.Voltage) { got.Rows = append(got.Rows, i.SI(), u.SI()) })
	userfile.Word(f.Root(), "way", &got.Way, "up", "down")
	f.Table("in").Table("a").Table("b").Text("c", &c)
	for _, m := range f.Tables("m") {
		var n int
		m.Int("n", &n, 1, 2)
		got.Ns = append(got.Ns, n)
	}
	if err := f.Err(); err != nil {
		t.Fatal(err)
	}
	got.Volts, got.Ohms, got.Tol, got.C = v.SI(), r.SI(), tol.SI(), c.SI()
	for _, x := range list {
		got.Supplies = append(got.Supplies, x.SI())
	}
	want := all{Name: "Bench 2", Day: "2026-03-01", Day2: "2026-03-02", Way: "up", Count: 1000, Share: 0.25, On: true,
		Volts: 9, Ohms: 4700, Tol: 4700, C: 1, Words: []string{"a", "b"}, Codes: []int{0, 16, 256}, Ns: []int{1, 2},
		Supplies: []float64{5, 9}, Rows: []float64{0.01, 1.4, 0.1, 1.7}}
	if d := cmp.Diff(want, got); d != "" {
		t.Error(d)
	}
}

// Every line is one mistake; ask reads it.
func TestGettersRefuse(t *testing.T) {
	var (
		s  string
		n  int
		x  float64
		b  bool
		v  si.Voltage
		ss []string
		ns []int
		vs []si.Voltage
	)
	text := func(t *userfile.Table) { t.Text("k", &v) }
	str := func(t *userfile.Table) { t.String("k", &s) }
	num := func(t *userfile.Table) { t.Number("k", &x) }
	whole := func(t *userfile.Table) { t.Int("k", &n, 0, 256) }
	list := func(t *userfile.Table) { userfile.Texts(t, "k", &vs) }
	pairs := func(t *userfile.Table) { userfile.Pairs(t, "k", func(si.Current, si.Voltage) {}) }
	for _, c := range []struct {
		line string
		ask  func(*userfile.Table)
		want string
	}{
		{`j = 1`, str, `f.toml:1: k: is missing`},
		{`k = 13`, text, `f.toml:1: k = 13: "13" has no unit; write a voltage like "9 V"; the line would be: k = "13 V"`},
		{`k = "13"`, text, `f.toml:1: k = "13": "13" has no unit; write a voltage like "9 V"; the line would be: k = "13 V"`},
		{`k = true`, text, `f.toml:1: k = true: give text in quotes`},
		{`k = "9 A"`, text, `f.toml:1: k = "9 A": "9 A" has an unknown unit "A" for a voltage`},
		{`k = nan`, text, `f.toml:1: k = nan: "nan" is not a voltage`},
		{`k = 5`, str, `f.toml:1: k = 5: give text in quotes; the line would be: k = "5"`},
		{`k = ["a"]`, str, `f.toml:1: k = ["a"]: give text in quotes`},
		{`k = "  "`, str, `f.toml:1: k = " ": is empty`},
		{`k = "5"`, num, `f.toml:1: k = "5": give a number without quotes`},
		{`k = inf`, num, `f.toml:1: k = inf: give a number without quotes`},
		{`k = 1.5`, whole, `f.toml:1: k = 1.5: give a whole number from 0 to 256`},
		{`k = 257`, whole, `f.toml:1: k = 257: give a whole number from 0 to 256`},
		{`k = 99999999999999999999`, whole, `f.toml:1: k = 99999999999999999999: give a whole number from 0 to 256`},
		{`k = "true"`, func(t *userfile.Table) { t.Bool("k", &b) }, `f.toml:1: k = "true": give true or false, without quotes`},
		{`k = "1 March"`, func(t *userfile.Table) { t.Date("k", &s) }, `f.toml:1: k = "1 March": give a date like "2026-03-01"`},
		{`k = 2026-02-30`, func(t *userfile.Table) { t.Date("k", &s) }, `f.toml:1: k = 2026-02-30: give a date`},
		{`k = "a"`, func(t *userfile.Table) { t.Strings("k", &ss) }, `f.toml:1: k = "a": give a list in square brackets`},
		{`k = [1]`, func(t *userfile.Table) { t.Strings("k", &ss) }, `f.toml:1: k = 1: give text in quotes`},
		{`k = []`, list, `f.toml:1: k = []: the list is empty; give at least one`},
		{`k = ["9 V", "12"]`, list, `f.toml:1: k = "12": "12" has no unit; write a voltage like "9 V"; the line would be: k = ["9 V", "12 V"]`},
		{`k = ["9 V", true]`, list, `f.toml:1: k = true: give text in quotes`},
		{`k = [1, 300]`, func(t *userfile.Table) { t.Ints("k", &ns, 0, 256) }, `f.toml:1: k = 300: give whole numbers from 0 to 256`},
		{`k = [["1 A"]]`, pairs, `f.toml:1: k = [["1 A"]]: give a list of pairs`},
		{`k = [["1 A", "1"]]`, pairs, `f.toml:1: k = "1": "1" has no unit`},
		{`k = "upp"`, func(t *userfile.Table) { userfile.Word(t, "k", &s, "up", "down", "both") }, `f.toml:1: k = "upp": use up, down or both; the line would be: k = "up"`},
		{`k = "left"`, func(t *userfile.Table) { userfile.Word(t, "k", &s, "up", "down") }, `f.toml:1: k = "left": use up or down`},
		{`k = 1`, func(t *userfile.Table) { t.Table("k") }, `f.toml:1: k = 1: is a number and has to be one table`},
		{`k = {}`, func(t *userfile.Table) { t.Tables("k") }, `f.toml:1: k = {}: is a table; write it as [[k]]`},
		{`j = 1`, func(t *userfile.Table) { t.Table("k") }, `f.toml:1: k: the table [k] is missing`},
		{`j = 1`, func(t *userfile.Table) { t.Tables("k") }, `f.toml:1: k: at least one [[k]] is needed`},
	} {
		t.Run(c.line+" "+c.want[len("f.toml:1: "):], func(t *testing.T) {
			f := parse(t, c.line)
			c.ask(f.Root())
			err := f.Failed()
			if err == nil || !strings.HasPrefix(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
				t.Fatalf("got  %v\nwant %s", err, c.want)
			}
		})
	}
}

func TestOptionalMayBeMissingButNotWrong(t *testing.T) {
	f := parse(t, `fuse = "1"`)
	a := si.Amperes(7)
	if f.Optional().Text("max", &a) || a.SI() != 7 {
		t.Error("a missing key changed the value")
	}
	if f.Optional().Table("sub").Present() || len(f.Optional().Tables("list")) != 0 {
		t.Error("what is missing is present")
	}
	if f.Err() == nil {
		t.Fatal("fuse was never asked for and no mistake")
	}
	f.Optional().Text("fuse", &a)
	if err := f.Err(); err == nil || !strings.Contains(err.Error(), "has no unit") {
		t.Errorf("got %v", err)
	}
}

func TestAMissingTableIsOneMistake(t *testing.T) {
	f := parse(t, "# nothing")
	var s string
	sub := f.Table("supply")
	sub.String("address", &s)
	sub.Table("deeper").String("x", &s)
	var es userfile.Errors
	if err := f.Err(); !errors.As(err, &es) || len(es) != 1 {
		t.Errorf("got %v, want one mistake", err)
	}
}

func TestErrorIsTypedAndSorted(t *testing.T) {
	f := parse(t, "b = 1\n\na = \"x\"\n")
	var n int
	var v si.Voltage
	f.Text("a", &v)
	f.Int("b", &n, 5, 9)
	err := f.Err()
	var e *userfile.Error
	if !errors.As(err, &e) {
		t.Fatalf("%T is no *userfile.Error", err)
	}
	want := userfile.Error{File: "f.toml", Line: 1, Key: "b", Found: "1", Want: "give a whole number from 5 to 9"}
	if d := cmp.Diff(want, *e); d != "" {
		t.Errorf("first mistake: %s", d)
	}
	if lines := strings.Split(err.Error(), "\n"); len(lines) != 2 || !strings.HasPrefix(lines[1], "f.toml:3: a = ") {
		t.Errorf("got %q", lines)
	}
}

func TestJoinKeepsMistakesAndPassesOthersOn(t *testing.T) {
	one := &userfile.Error{File: "a.toml", Want: "is empty"}
	two := userfile.Errors{{File: "b.toml", Line: 3, Want: "x"}}
	err := userfile.Join(nil, one, two)
	if got := fmt.Sprint(err); got != "a.toml: is empty\nb.toml:3: x" {
		t.Errorf("got %q", got)
	}
	if userfile.Join(nil, nil) != nil {
		t.Error("nothing joined is something")
	}
	other := errors.New("disk on fire")
	if userfile.Join(one, other) != other {
		t.Error("another error was lost")
	}
}

func TestRoundTripOfQuantities(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		want := si.Volts(float64(rapid.IntRange(-99_999, 99_999).Draw(t, "digits")) * math.Pow10(rapid.IntRange(-9, 3).Draw(t, "exponent")))
		b, err := want.MarshalText()
		if err != nil {
			t.Fatal(err)
		}
		f, err := userfile.Parse("f.toml", []byte("k = "+strconv.Quote(string(b))+" # comment\n"))
		if err != nil {
			t.Fatal(err)
		}
		var got si.Voltage
		if !f.Text("k", &got) || math.Abs(got.SI()-want.SI()) > 1e-9*math.Abs(want.SI()) {
			t.Fatalf("%s came back as %s: %v", want, got, f.Err())
		}
	})
}

func TestRoundTripOfText(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		want := rapid.StringMatching(`[a-zA-Z0-9 "\\#=äΩ\[\]{}.,]{0,30}x`).Draw(t, "text")
		f, err := userfile.Parse("f.toml", []byte("[t]\nk = "+strconv.Quote(want)))
		if err != nil {
			t.Fatal(err)
		}
		var got string
		f.Table("t").String("k", &got)
		if err := f.Err(); err != nil || got != want {
			t.Fatalf("%q came back as %q: %v", want, got, err)
		}
	})
}
