package sweeps

import (
	"errors"
	"fmt"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// ReadPlan reads a plan file and the board file it names, whose path is taken
// from the plan's folder. Every mistake in both is reported, with its line.
// Whether plan, board and bench go together is for CheckPlan to say.
func ReadPlan(path string) (Plan, Board, error) {
	f, err := userfile.Read(path)
	if err != nil {
		return Plan{}, Board{}, err
	}
	p := planOf(f)
	b, boardErr := boardBeside(f, &p)
	if err := userfile.Join(f.Err(), boardErr); err != nil {
		return Plan{}, Board{}, err
	}
	return p, b, nil
}

// boardBeside reads the board that a plan names. A board that isn't there is the plan's mistake.
func boardBeside(f *userfile.File, p *Plan) (Board, error) {
	if p.BoardPath == "" {
		return Board{}, nil
	}
	b, err := ReadBoard(p.BoardPath)
	if errors.Is(err, fs.ErrNotExist) {
		there := beside(p.BoardPath)
		want := fmt.Sprintf("no such file: %s; the path counts from the plan's folder", p.BoardPath)
		if len(there) > 0 {
			want += "; in that folder are: " + strings.Join(there, ", ")
		}
		f.Look("plan").Suggest("board", filepath.Base(p.BoardPath), there, want)
		return Board{}, nil
	}
	return b, err
}

// beside are the first TOML files in the folder of a path; none where it can't be read.
func beside(path string) []string {
	entries, err := os.ReadDir(filepath.Dir(path))
	if err != nil {
		return nil
	}
	var found []string
	for _, e := range entries {
		if filepath.Ext(e.Name()) == ".toml" && len(found) < 8 {
			found = append(found, e.Name())
		}
	}
	return found
}

// planOf reads everything but the board.
func planOf(f *userfile.File) Plan {
	p := Plan{Path: f.Name, Text: f.Source}
	head(f.Table("plan"), &p)
	for _, t := range f.Tables("axis") {
		p.Axes = append(p.Axes, axis(t))
	}
	noAxisTwice(f, p.Axes)
	warmUp(f.Optional().Table("warm_up"), &p)
	settle(f.Table("settle"), &p.Settle)
	measure(f.Table("measure"), &p.Measure)
	p.Trips = trips(f.Optional().Table("trip"))
	p.Accept = accept(f.Optional().Table("accept"))
	f.NotYet("recheck", "leave it out, and step the axis in both directions to see drift")
	f.NotYet("seek", "leave it out, and step the axis finely where the threshold is expected")
	f.NotYet("densify", "leave it out, and give the axis more points")
	return p
}

func head(t *userfile.Table, p *Plan) {
	t.String("name", &p.Name)
	var board string
	if t.String("board", &board) {
		p.BoardPath = board
		if !filepath.IsAbs(board) {
			p.BoardPath = filepath.Join(filepath.Dir(p.Path), board)
		}
	}
	o := t.Optional()
	duration(o, "at_most", &p.AtMost, positive)
	o.String("attended", &p.Attended)
	p.Ambient = override[si.Temperature](o, "ambient", ambient)
	if o.String("safe_by", &p.SafeBy) {
		if _, err := time.Parse("15:04", p.SafeBy); err != nil {
			t.Fail("safe_by", `give the time of day, like "07:00"`)
		}
	}
}

// ambient is what the parts of a board are commonly specified for, °C: the industrial range (common practice, no source).
func ambient(celsius float64) (bool, string) {
	return celsius >= -40 && celsius <= 85, `give the temperature about the board, from -40 to 85 degC, like "22 degC"`
}

// warmUp reads where and how long to dwell before the first point.
func warmUp(t *userfile.Table, p *Plan) {
	if !t.Present() {
		return
	}
	p.WarmUp = &WarmUp{}
	duration(t, "for", &p.WarmUp.For, positive)
	at := t.Table("at")
	signed(at, "supply_voltage", &p.WarmUp.At.Supply, positive)
	signed(at.Optional(), "pot_resistance", &p.WarmUp.At.Pot, positive)
	signed(at.Optional(), "pot_position", &p.WarmUp.At.Position, share)
	at.NotYet("pot_code", "give pot_resistance")
}

func settle(t *userfile.Table, s *Settle) {
	quantityWord(t, "watch", &s.Watch)
	var steady si.Ratio
	if signed(t, "steady", &steady, positive) {
		s.Steady = steady.SI()
		if s.Steady >= 1 {
			t.Fail("steady", `give the change that still counts as steady, below 100 %, like "1 %"`)
		}
	}
	duration(t, "at_most", &s.AtMost, positive)
}

func measure(t *userfile.Table, m *Measure) {
	var names []string
	if t.Strings("quantities", &names) {
		seen := map[string]bool{}
		for i, n := range names {
			switch q := Quantity(n); {
			case !q.Known():
				unknownQuantity(t, "quantities", n)
			case seen[n]:
				t.FailItem("quantities", i, "is there twice")
			default:
				m.Quantities = append(m.Quantities, q)
			}
			seen[n] = true
		}
	}
	// Two readings are the fewest whose scatter says anything (a type A uncertainty has repeats − 1 degrees of freedom).
	t.Int("repeats", &m.Repeats, 2, 1000)
	keep := "never"
	if t.Optional().String("keep_waveform", &keep); keep != "never" {
		n, ok := everyNth(keep)
		if !ok {
			t.Fail("keep_waveform", `use "never", "always" or "every 10"`)
		}
		m.KeepWaveform = n
	}
}

// everyNth reads "always" as 1 and "every N" as N.
func everyNth(s string) (int, bool) {
	if s == "always" {
		return 1, true
	}
	rest, ok := strings.CutPrefix(s, "every ")
	n, err := strconv.Atoi(strings.TrimSpace(rest))
	return n, ok && err == nil && n >= 1
}

// duration reads a time of at most a year.
func duration(t *userfile.Table, key string, d *time.Duration, s sign) bool {
	var v si.Time
	if !signed(t, key, &v, s) {
		return false
	}
	if v.SI() > 366*24*3600 {
		t.Fail(key, "is more than a year")
		return false
	}
	*d = time.Duration(math.Round(v.SI() * 1e9))
	return true
}

// quantityWord reads the name of a quantity.
func quantityWord(t *userfile.Table, key string, q *Quantity) bool {
	var name string
	if !t.String(key, &name) {
		return false
	}
	if !Quantity(name).Known() {
		unknownQuantity(t, key, name)
		return false
	}
	*q = Quantity(name)
	return true
}

// unknownQuantity says which quantities there are.
func unknownQuantity(t *userfile.Table, key, name string) {
	names := make([]string, len(Quantities))
	for i, q := range Quantities {
		names[i] = string(q.Name)
	}
	t.Suggest(key, name, names, fmt.Sprintf("%q is no quantity; there are: %s", name, strings.Join(names, ", ")))
}
