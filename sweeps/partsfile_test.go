package sweeps_test

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightbench/sweeps"
)

const catalogueMotor = "[load]\nkind = \"motor\"\npart = \"1331T012SR\"\n"

// besideBoard writes a board file and, beside it, other files; it gives the board's path.
func besideBoard(t *testing.T, files map[string]string) string {
	t.Helper()
	path := written(t, "board.toml", boardHead+steered+noStage+resistor1k)
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(filepath.Dir(path), name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return path
}

func TestPartsBesideABoard(t *testing.T) {
	path := besideBoard(t, map[string]string{"z.parts.toml": "# ours\n[[diode]]\n", "a.parts.toml": "[[motor]]\n", "other.toml": "x", "parts.toml": "x"})
	b, err := sweeps.ReadBoard(path)
	if err != nil {
		t.Fatal(err)
	}
	dir := filepath.Dir(path)
	want := []sweeps.File{
		{Role: "parts", Name: filepath.Join(dir, "a.parts.toml"), Text: "[[motor]]\n"},
		{Role: "parts", Name: filepath.Join(dir, "z.parts.toml"), Text: "# ours\n[[diode]]\n"},
	}
	if len(b.Parts) != 2 || b.Parts[0] != want[0] || b.Parts[1] != want[1] {
		t.Errorf("parts %+v, want %+v", b.Parts, want)
	}
	kept := append([]sweeps.File{{Role: "board", Name: "board.toml", Text: b.Text}}, b.Parts...)
	again, err := sweeps.ParseBoard(kept[0], sweeps.PartsOf(kept)...)
	if err != nil || len(again.Parts) != 2 || again.Parts[1] != want[1] {
		t.Errorf("from copies: %+v, %v", again.Parts, err)
	}
}

func TestMistakesOfFormInPartsFiles(t *testing.T) {
	_, err := sweeps.ReadBoard(besideBoard(t, map[string]string{"a.parts.toml": "[[motor]]\nname = \n", "b.parts.toml": "x = 1\nx = 2\n"}))
	if err == nil || !strings.Contains(err.Error(), "a.parts.toml:2: ") || !strings.Contains(err.Error(), "b.parts.toml:2: x") {
		t.Errorf("%v", err)
	}
}

func TestMotorOfTheCatalogue(t *testing.T) {
	head := boardHead + steered + noStage + "flyback = \"none\"\n" + catalogueMotor
	l := mustRead(t, head+"static_torque = \"0.2 mN m\"\nmax_current = \"300 mA\"\nmax_power = \"1.5 W\"\n").Load
	if l.Part != "1331T012SR" || l.Resistance.SI() != 0 || l.StaticTorque.SI() != 0.2e-3 || l.MaxCurrent.SI() != 0.3 || l.MaxPower.SI() != 1.5 {
		t.Errorf("load %+v", l)
	}
	if l := mustRead(t, head+"coulomb_torque = \"0.2 mN m\"\n").Load; l.StaticTorque.SI() != 0 || l.MaxCurrent != nil || l.MaxPower != nil {
		t.Errorf("load %+v", l)
	}
	for _, c := range []struct{ line, want string }{
		{`brush_drop = "0 V"`, `load.brush_drop = "0 V": has to be above zero`},
		{`max_current = "0 A"`, `load.max_current = "0 A": has to be above zero`},
		{`max_power = "2"`, `load.max_power = "2": "2" has no unit; write a power like "2 W"; the line would be: max_power = "2 W"`},
		{"coulomb_torque = \"0.2 mN m\"\nstatic_torque = \"0.1 mN m\"", `load.static_torque = "0.1 mN m": can't be below the coulomb torque`},
	} {
		if _, err := readBoard(t, head+c.line+"\n"); err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: %v", c.line, err)
		}
	}
	if _, err := readBoard(t, boardHead+steered+noStage+resistor1k+"part = \"1331T012SR\"\n"); err == nil || !strings.Contains(err.Error(), `load.part = "1331T012SR": a load of kind "resistor" has no use for it`) {
		t.Errorf("a resistor with a motor's part: %v", err)
	}
	s := mustRead(t, head).Schematic()
	if p := s.Parts[len(s.Parts)-1]; p.Name != "load" || p.Value != "1331T012SR" || p.Written != "1331T012SR" {
		t.Errorf("drawn as %+v", p)
	}
}
