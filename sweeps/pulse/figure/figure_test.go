package figure

import (
	"encoding/xml"
	"errors"
	"io"
	"strings"
	"testing"

	"nightbench/sweeps/pulse"
)

// board is a pulse train of 9 V, 30 % high, 100 samples a period of 1 ms.
func board(t *testing.T, n int) Panel {
	t.Helper()
	r := pulse.Record{Interval: 1e-5}
	for i := range n {
		v := 0.1 + 0.02*float64(i%3)
		if (i+70)%100 < 30 {
			v += 8.8
		}
		r.Volts = append(r.Volts, v)
	}
	return panelOf(t, r)
}

func panelOf(t *testing.T, r pulse.Record) Panel {
	t.Helper()
	res, err := pulse.Analyse(r, pulse.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return Panel{Name: "CH1 <a&b>", Unit: "V", Record: r, Result: res}
}

// drawing is what Write drew: all words in order, and how many of each element there are.
func drawing(t *testing.T, panels ...Panel) (words string, count map[string]int) {
	t.Helper()
	var b strings.Builder
	if err := Write(&b, "pump.csv", strings.Repeat("commas between fields; ", 12), panels); err != nil {
		t.Fatal(err)
	}
	if strings.Contains(b.String(), "NaN") || strings.Contains(b.String(), "Inf") {
		t.Error("a mark has no place")
	}
	count = map[string]int{}
	for d := xml.NewDecoder(strings.NewReader(b.String())); ; {
		tok, err := d.Token()
		if err == io.EOF {
			return words, count
		}
		if err != nil {
			t.Fatal(err)
		}
		switch e := tok.(type) {
		case xml.StartElement:
			count[e.Name.Local]++
		case xml.CharData:
			words += string(e) + "\n"
		}
	}
}

func TestPulseTrain(t *testing.T) {
	p := board(t, 560)
	words, count := drawing(t, p)
	for _, want := range []string{"pump.csv", "CH1 <a&b>, V", "two-level, 5 whole periods", "high level 8.9", "low level 1", "50 % 4.5", "duty 0.3", "period ", "rises at", "4\u00a0ms"} {
		if !strings.Contains(words, want) {
			t.Errorf("no words %q in\n%s", want, words)
		}
	}
	if count["circle"] != len(p.Result.Instants) {
		t.Errorf("%d instants marked of %d", count["circle"], len(p.Result.Instants))
	}
}

// Of a long record the first periods are drawn, and it is said.
func TestLongRecord(t *testing.T) {
	words, count := drawing(t, board(t, 20_000))
	if !strings.Contains(words, "the first 6 are drawn") || count["circle"] < 13 || count["circle"] > 15 {
		t.Errorf("%d instants marked; %s", count["circle"], words)
	}
	var b strings.Builder
	fine := pulse.Record{Interval: 1e-8}
	for i := range 500_000 {
		fine.Volts = append(fine.Volts, 9*float64(i/50_000%2))
	}
	if err := Write(&b, "fine", "", []Panel{panelOf(t, fine)}); err != nil || b.Len() > 100_000 {
		t.Errorf("%d bytes, %v", b.Len(), err)
	}
}

// What is no pulse train is drawn all the same.
func TestNoPulses(t *testing.T) {
	flat, ramp := pulse.Record{Interval: 1}, pulse.Record{Interval: 1}
	for i := range 100 {
		flat.Volts = append(flat.Volts, 5)
		ramp.Volts = append(ramp.Volts, float64(i))
	}
	untimed := board(t, 560)
	untimed.Record.Interval = 1
	untimed = panelOf(t, untimed.Record)
	untimed.Untimed, untimed.Result = true, untimed.Result.Untimed()
	words, count := drawing(t, panelOf(t, flat), panelOf(t, ramp), untimed)
	if count["g"] != 3 || !strings.Contains(words, "constant") || !strings.Contains(words, "not a pulse train") || !strings.Contains(words, "sample") {
		t.Errorf("%d panels; %s", count["g"], words)
	}
}

type full struct{}

var errFull = errors.New("disk full")

func (full) Write([]byte) (int, error) { return 0, errFull }

func TestWritersErrorIsPassedOn(t *testing.T) {
	if err := Write(full{}, "", "", nil); !errors.Is(err, errFull) {
		t.Error(err)
	}
}
