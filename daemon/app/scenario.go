package app

import (
	"embed"
	"errors"
	"fmt"
	"io/fs"
	"maps"
	"slices"
	"strings"
	"time"

	"nightbench/instruments/practice"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

//go:embed scenarios/*.toml
var scenarios embed.FS

// Scenario says which specimen is on the practice bench, in what its instruments
// differ, and what goes wrong when.
type Scenario struct {
	Name, About string
	Seed        *uint64 // of the specimen; nil: the one the demo was given
	Substitutes []Substitute
	Climate     *practice.Climate // nil: as the specimen's seed says
	Supply      practice.Supply
	Scope       practice.Scope
	Faults      []Planned
}

// Substitute is a part fitted in place of the schematic's.
type Substitute struct {
	Part   string  // "capacitor", "charge", "charge_diode"
	Value  float64 // SI; 0: not told
	Times  float64 // of what the specimen would have; 0: not told
	Fitted string  // a diode of the catalogue
}

// Planned is a fault and the bench time at which it comes.
type Planned struct {
	practice.Fault
	At time.Duration
}

// String is the fault in words, with its time.
func (p Planned) String() string {
	words := string(p.Kind)
	if p.On != "" {
		words += " on " + p.On
	}
	if p.At > 0 {
		words += fmt.Sprintf(", %s after the start", p.At)
	}
	if p.For > 0 {
		words += fmt.Sprintf(", for %g s", p.For)
	}
	if p.Times > 0 {
		words += fmt.Sprintf(", %d replies", p.Times)
	}
	return words
}

// ScenarioNames are the scenarios built in.
func ScenarioNames() (names []string) {
	files, err := fs.Glob(scenarios, "scenarios/*.toml")
	if err != nil {
		panic(err) // the pattern is a constant
	}
	for _, f := range files {
		names = append(names, strings.TrimSuffix(strings.TrimPrefix(f, "scenarios/"), ".toml"))
	}
	return names
}

// ReadScenario reads a scenario by its built-in name, or from the user's own file.
func ReadScenario(name string) (Scenario, error) {
	if slices.Contains(ScenarioNames(), name) {
		text, err := scenarios.ReadFile("scenarios/" + name + ".toml")
		if err != nil {
			return Scenario{}, err
		}
		return ParseScenario(name+".toml", text)
	}
	f, err := userfile.Read(name)
	if errors.Is(err, fs.ErrNotExist) {
		return Scenario{}, fmt.Errorf("scenario %q is no file and none of those built in: %s", name, strings.Join(ScenarioNames(), ", "))
	}
	if err != nil {
		return Scenario{}, err
	}
	return readScenario(f)
}

// ParseScenario reads a scenario's text. Every mistake is told with its line.
func ParseScenario(name string, text []byte) (Scenario, error) {
	f, err := userfile.Parse(name, text)
	if err != nil {
		return Scenario{}, err
	}
	return readScenario(f)
}

func readScenario(f *userfile.File) (s Scenario, err error) {
	head := f.Table("scenario")
	head.String("name", &s.Name)
	head.Optional().String("about", &s.About)
	var seed int
	if head.Optional().Int("seed", &seed, 0, 1<<31-1) {
		n := uint64(seed)
		s.Seed = &n
	}
	for _, t := range f.Optional().Tables("substitute") {
		s.Substitutes = append(s.Substitutes, readSubstitute(t))
	}
	readSupply(f.Optional().Table("supply").Optional(), &s.Supply)
	readScope(f.Optional().Table("scope").Optional(), &s.Scope)
	s.Climate = readClimate(f.Optional().Table("climate").Optional())
	for _, t := range f.Optional().Tables("fault") {
		if p, ok := readFault(t); ok {
			s.Faults = append(s.Faults, p)
		}
	}
	return s, f.Err()
}

// units are what the value of a part is told in.
var partUnits = map[string]interface {
	UnmarshalText([]byte) error
	SI() float64
}{
	"capacitor": &si.Capacitance{}, "charge": &si.Resistance{}, "discharge": &si.Resistance{}, "stop": &si.Resistance{}, "common": &si.Resistance{},
	"load.resistance": &si.Resistance{}, "load.inductance": &si.Inductance{},
}

func readSubstitute(t *userfile.Table) (s Substitute) {
	t.String("part", &s.Part)
	o := t.Optional()
	o.String("fitted", &s.Fitted)
	if o.Number("times", &s.Times) && s.Times <= 0 {
		t.Fail("times", "give by how much the part is larger, above 0: 1.5")
	}
	if t.Has("value") {
		unit, ok := partUnits[s.Part]
		if !ok {
			t.Refuse("value", "a value is known for "+strings.Join(slices.Sorted(maps.Keys(partUnits)), ", ")+"; use times = 1.5, or fitted = a diode of the catalogue")
		} else if o.Text("value", unit) {
			if s.Value = unit.SI(); s.Value <= 0 {
				t.Fail("value", "has to be above 0")
			}
		}
	}
	given := 0
	for _, key := range []string{"value", "times", "fitted"} {
		if t.Has(key) {
			given++
		}
	}
	if given != 1 {
		t.Fail("", "say with one of value, times or fitted what stands in the part's place")
	}
	return s
}

func readSupply(t *userfile.Table, s *practice.Supply) {
	t.Bool("stays_off", &s.StaysOff)
	t.Bool("resumes", &s.Resumes)
	seconds(t, "watchdog", &s.Watchdog)
}

func readScope(t *userfile.Table, s *practice.Scope) {
	if t.Int("bits", &s.Bits, 8, 12) && s.Bits != 8 && s.Bits != 12 {
		t.Fail("bits", "give 8 or 12")
	}
	var f si.Frequency
	if t.Text("bandwidth", &f) {
		if s.Bandwidth = f.SI(); s.Bandwidth <= 0 {
			t.Fail("bandwidth", "has to be above 0")
		}
	}
	userfile.Word(t, "form", &s.Form, practice.Forms()...)
	t.Bool("percent", &s.Percent)
	t.String("no_value", &s.NoValue)
	userfile.Word(t, "tail", &s.Tail, practice.Tails()...)
}

// seconds reads a time at or above 0.
func seconds(t *userfile.Table, key string, v *float64) bool {
	var x si.Time
	if !t.Text(key, &x) {
		return false
	}
	if *v = x.SI(); *v < 0 {
		t.Fail(key, "can't be below 0")
	}
	return true
}

func readClimate(t *userfile.Table) *practice.Climate {
	if !t.Present() {
		return nil
	}
	c := practice.Climate{}
	var room si.Temperature
	if t.Text("room", &room) {
		c.Room = room.SI() + 273.15
	}
	t.Number("swing_kelvin", &c.Swing)
	t.Number("rise_kelvin", &c.Rise)
	seconds(t, "warm_up", &c.Tau)
	seconds(t, "night", &c.Night)
	t.Number("capacitor_ppm_per_kelvin", &c.CapacitorPerKelvin)
	c.CapacitorPerKelvin *= 1e-6
	if c.Room == 0 {
		t.Fail("room", `give the room's temperature at the start, like "23 degC"`)
	}
	return &c
}

// readFault reads one fault; what does not fit its kind is told at its key.
func readFault(t *userfile.Table) (p Planned, ok bool) {
	var kinds []practice.Kind
	for _, trait := range practice.Traits() {
		kinds = append(kinds, trait.Kind)
	}
	o := t.Optional()
	var at, lasts float64
	seconds(o, "at", &at)
	seconds(o, "for", &lasts)
	o.String("on", &p.On)
	o.Int("times", &p.Times, 1, 1<<30)
	o.String("says", &p.Says)
	p.At, p.For = time.Duration(at*float64(time.Second)), lasts
	if !userfile.Word(t, "kind", &p.Kind, kinds...) {
		t.Known("size")
		return p, false
	}
	trait, err := practice.TraitOf(p.Kind)
	if err != nil {
		t.Fail("kind", err.Error())
		return p, false
	}
	readSize(o, trait, &p.Size)
	return p, true
}

// readSize reads a fault's size in the unit of its kind.
func readSize(t *userfile.Table, trait practice.Trait, v *float64) {
	switch trait.Unit {
	case "":
		t.Refuse("size", "a fault "+string(trait.Kind)+" has no size")
	case "s":
		seconds(t, "size", v)
	case "Ω":
		var r si.Resistance
		if t.Text("size", &r) {
			*v = r.SI()
		}
	case "bytes":
		var n int
		if t.Int("size", &n, 1, 1<<20) {
			*v = float64(n)
		}
	default: // a share an hour
		var x si.Ratio
		if t.Text("size", &x) {
			*v = x.SI()
		}
	}
}

// ParseFault reads a fault from one line of words, as --fault takes it: the kind first,
// then the keys of a scenario file: "late on=average size=4s at=10min".
func ParseFault(words string) (Planned, error) {
	f := strings.Fields(words)
	if len(f) == 0 {
		return Planned{}, errors.New(`no fault is named; write it like "late on=average size=4s at=10min"`)
	}
	var text strings.Builder
	fmt.Fprintf(&text, "kind = %q\n", f[0])
	for _, w := range f[1:] {
		key, value, ok := strings.Cut(w, "=")
		if !ok {
			return Planned{}, fmt.Errorf(`fault %q: %q is no key=value; write it like "late on=average size=4s at=10min"`, words, w)
		}
		if key != "times" && !(key == "size" && digits(value)) {
			value = fmt.Sprintf("%q", value)
		}
		fmt.Fprintf(&text, "%s = %s\n", key, value)
	}
	file, err := userfile.Parse("--fault", []byte(text.String()))
	if err != nil {
		return Planned{}, err
	}
	p, _ := readFault(file.Root())
	return p, file.Err()
}

func digits(s string) bool { return s != "" && strings.Trim(s, "0123456789") == "" }
