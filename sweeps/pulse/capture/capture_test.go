package capture

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
	"testing"
	"unicode/utf16"

	"nightbench/sweeps/pulse"
)

// The captures are invented: the timer's output of a dosing-pump driver board, 9 V,
// 1 kHz, 30 % high, and the current of its pump, 240 samples 20 µs apart from −1 ms on.
const (
	count = 240
	dt    = 20e-6
	begin = -1e-3
)

func at(i int) float64 { return begin + float64(i)*dt }

func volt(i int) float64 {
	if i%50 >= 10 && i%50 < 25 {
		return 8.92 + 0.04*float64(i%3)
	}
	return 0.08 + 0.04*float64(i%3)
}

func amp(i int) float64 { return 0.12 + 0.001*float64(i%50) }

// rows writes one line a sample.
func rows(line func(i int) string) string {
	var b strings.Builder
	for i := range count {
		b.WriteString(line(i) + "\n")
	}
	return b.String()
}

func comma(s string) string { return strings.ReplaceAll(s, ".", ",") }

// layouts are ways in which scopes of several makers lay out what they export, from memory.
var layouts = map[string]struct {
	text  string
	names []string
	says  string // what read_as must contain
}{
	"plain table": {
		"Time,CH1,CH2\n" + rows(func(i int) string { return fmt.Sprintf("%.6e,%.3f,%.4f", at(i), volt(i), amp(i)) }),
		[]string{"CH1", "CH2"}, "times in field 1 (no unit given: taken as s)"},
	"units in a line of their own": {
		"x-axis,1,2\nsecond,Volt,Volt\n" + rows(func(i int) string { return fmt.Sprintf("%+.8E,%+.4E,%+.4E", at(i), volt(i), amp(i)) }),
		[]string{"1", "2"}, "times in field 1 (s)"},
	"header block, units in brackets, milliseconds": {
		"Model,Bench scope\nSerial,12345\nDate,2026-11-03 21:14:09\nRecord Length,240\nSource,CH1\n\nTime (ms),CH1 (mV),CH2 (V)\n\n" +
			rows(func(i int) string { return fmt.Sprintf("%.3f,%.1f,%.4f", 1e3*at(i), 1e3*volt(i), amp(i)) }),
		[]string{"CH1", "CH2"}, "CH1 in field 2 (mV)"},
	"start and increment in columns": {
		fmt.Sprintf("X,CH1,CH2,Start,Increment,\nSequence,Volt,Volt,%.6e,%.6e\n", begin, dt) +
			rows(func(i int) string { return fmt.Sprintf("%d,%.2e,%.3e,,", i, volt(i), amp(i)) }),
		[]string{"CH1", "CH2"}, "apart by the header's Increment"},
	"metadata in leading columns": {
		rows(func(i int) string {
			lead := map[int]string{0: "Record Length,240", 1: fmt.Sprintf("Sample Interval,%g", dt), 2: "Trigger Point,50", 3: "Source,CH1", 4: "Vertical Units,V", 5: "Vertical Scale,2", 6: "Horizontal Units,s", 7: "Probe Atten,10"}[i]
			if lead == "" {
				lead = ","
			}
			return fmt.Sprintf("%s,,%013.9f,%010.5f,", lead, at(i), volt(i))
		}),
		[]string{"CH1"}, "CH1 in field 5 (V)"},
	"semicolons and decimal commas": {
		"Zeit;Kanal A;Kanal B\n(ms);(V);(mA)\n\n" + comma(rows(func(i int) string { return fmt.Sprintf("%.5f;%.3f;%.2f", 1e3*at(i), volt(i), 1e3*amp(i)) })),
		[]string{"Kanal A", "Kanal B"}, "semicolons between fields"},
	"tabs and decimal commas, quoted": {
		"\"Time [us]\"\t\"Channel 1\"\n" + comma(rows(func(i int) string { return fmt.Sprintf("\"%.2f\"\t\"%.3f\"", 1e6*at(i), volt(i)) })),
		[]string{"Channel 1"}, "times in field 1 (µs)"},
	"values only, with a rate": {
		"#CHANNEL: CH1\n#SAMPLE RATE: 50kSa/s\n#SIZE: 240\nCH1 in V\n" + rows(func(i int) string { return fmt.Sprintf("%.4f", volt(i)) }),
		[]string{"CH1"}, "apart by the header's SAMPLE RATE"},
	"key and prefixed value": {
		"Record Length,Analog:240\nSample Interval,Analog:2.00E-05\nVertical Units,CH1:V CH2:A,\nVertical Scale,CH1:2.00 CH2:0.05,\nSource,CH1 CH2\nSecond,Value,Value\n" +
			rows(func(i int) string { return fmt.Sprintf("%+.10f,%.5f,%.5f", at(i), volt(i), amp(i)) }),
		[]string{"CH1", "CH2"}, "CH2 in field 3 (A)"},
	"a segment table": {
		"MAKER,7,Waveform\nSegments,1,SegmentSize,240\nSegment,TrigTime,TimeSinceSegment1\n#1,03-Nov-2026 21:14:09,0\nTime,Ampl\n" +
			rows(func(i int) string { return fmt.Sprintf("%.6g,%.5g", at(i), volt(i)) }),
		[]string{"Ampl"}, "a header of 5 lines"},
	"a time column for each channel": {
		"CH1 time,CH1 V,CH2 time,CH2 A\n" + rows(func(i int) string { return fmt.Sprintf("%.7f,%.3f,%.7f,%.4f", at(i), volt(i), at(i)+1e-6, amp(i)) }),
		[]string{"CH1 V", "CH2 A"}, "times in field 3"},
	"blanks between fields": {
		"% time  volts\n" + rows(func(i int) string { return fmt.Sprintf("  %.6f   %8.4f", at(i), volt(i)) }),
		[]string{"volts"}, "blanks between fields"},
	"no header at all": {
		rows(func(i int) string { return fmt.Sprintf("%.6f,%.3f", at(i), volt(i)) }),
		[]string{"channel 1"}, "no header"},
	"decimal commas between commas": {
		"Time,CH1\n" + comma(rows(func(i int) string { return fmt.Sprintf("%.6f,%.3f", at(i), volt(i)) })),
		[]string{"CH1"}, "decimal commas"},
	"remarks below": {
		"Time (s);CH1 (V)\n" + rows(func(i int) string { return fmt.Sprintf("%.6f;%.3f", at(i), volt(i)) }) + "\nEnd of record\n",
		[]string{"CH1"}, "was left out"},
	"cut short": {
		"Time (s);CH1 (V)\n" + rows(func(i int) string { return fmt.Sprintf("%.6f;%.3f", at(i), volt(i)) }) + "0.00",
		[]string{"CH1"}, "cut short"},
	"start and increment once, beside the first sample": {
		"Time,CH1,t0 [s],tInc [s]\n" + rows(func(i int) string {
			if i == 0 {
				return fmt.Sprintf("%d,%.3f,%g,%g", i, volt(i), begin, dt)
			}
			return fmt.Sprintf("%d,%.3f,,", i, volt(i))
		}),
		[]string{"CH1"}, "apart by the header's tInc"},
	"time of day": {
		"Clock,CH1 (V)\n" + rows(func(i int) string { return fmt.Sprintf("2026-11-03 21:14:%09.6f,%.3f", 9-begin+at(i), volt(i)) }),
		[]string{"CH1"}, "times in field 1"},
}

func TestLayouts(t *testing.T) {
	for name, l := range layouts {
		for _, end := range []string{"\n", "\r\n", "\r"} {
			f, err := Read(strings.NewReader(strings.ReplaceAll(l.text, "\n", end)), "pump.csv")
			if err != nil {
				t.Errorf("%s: %v", name, err)
				break
			}
			check(t, name, f, l.names, l.says)
		}
	}
}

func check(t *testing.T, name string, f File, names []string, says string) {
	t.Helper()
	var got []string
	for _, c := range f.Channels {
		got = append(got, c.Name)
	}
	if fmt.Sprint(got) != fmt.Sprint(names) {
		t.Errorf("%s: channels %q, want %q; read as %s", name, got, names, f.ReadAs)
		return
	}
	if !strings.Contains(f.ReadAs, says) {
		t.Errorf("%s: read as %q, which does not say %q", name, f.ReadAs, says)
	}
	for k, c := range f.Channels {
		want := volt
		if k == 1 {
			want = amp
		}
		r := c.Record
		if len(r.Volts) != count || c.Untimed {
			t.Errorf("%s: %s has %d samples, untimed %v; read as %s", name, c.Name, len(r.Volts), c.Untimed, f.ReadAs)
			continue
		}
		for i, v := range r.Volts {
			if math.Abs(v-want(i)) > 0.006 {
				t.Errorf("%s: %s sample %d is %g, want %g", name, c.Name, i, v, want(i))
				break
			}
		}
		first, last := r.Start, r.Start+r.Interval*(count-1)
		if r.Times != nil {
			first, last = r.Times[0], r.Times[count-1]
		}
		if math.Abs(last-first-dt*(count-1)) > 1e-7 {
			t.Errorf("%s: %s lasts %g s, want %g s", name, c.Name, last-first, dt*(count-1))
		}
	}
}

func TestUTF16(t *testing.T) {
	text := "Time (s);CH1 (V)\r\n" + rows(func(i int) string { return fmt.Sprintf("%.6f;%.3f", at(i), volt(i)) })
	for _, order := range []binary.AppendByteOrder{binary.LittleEndian, binary.BigEndian} {
		var b []byte
		for _, u := range utf16.Encode([]rune("\ufeff" + text)) {
			b = order.AppendUint16(b, u)
		}
		f, err := Read(strings.NewReader(string(b)), "pump.csv")
		if err != nil {
			t.Fatal(err)
		}
		check(t, "UTF-16", f, []string{"CH1"}, "semicolons")
	}
	f, err := Read(strings.NewReader("\ufeff"+text), "pump.csv")
	if err != nil {
		t.Fatal(err)
	}
	check(t, "UTF-8 with its mark", f, []string{"CH1"}, "semicolons")
}

func mustRead(t *testing.T, text string) File {
	t.Helper()
	f, err := Read(strings.NewReader(text), "pump.csv")
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func TestOverload(t *testing.T) {
	f := mustRead(t, "Time;A\n(ms);(V)\n\n"+rows(func(i int) string {
		if volt(i) > 5 {
			return comma(fmt.Sprintf("%.3f;∞", 1e3*at(i)))
		}
		return comma(fmt.Sprintf("%.3f;%.3f", 1e3*at(i), volt(i)+float64(i%50)/10))
	}))
	r, err := pulse.Analyse(f.Channels[0].Record, pulse.Options{})
	if err != nil || !r.Flagged(pulse.Clipped) {
		t.Errorf("%v, flags %v", err, r.Flags)
	}
}

// Stamps of six digits on a record far from zero repeat; the header knows better.
func TestCoarseStamps(t *testing.T) {
	body := rows(func(i int) string { return fmt.Sprintf("%.4f,%.3f", 12+at(i), volt(i)) })
	f := mustRead(t, "Sample interval,20 us\nTime,CH1\n"+body)
	c := f.Channels[0]
	if math.Abs(c.Record.Interval-dt) > 1e-12 || len(c.Flags) != 1 || c.Flags[0].Name != pulse.CoarseTime {
		t.Errorf("interval %g, flags %v", c.Record.Interval, c.Flags)
	}
	if c = mustRead(t, "Time,CH1\n"+body).Channels[0]; c.Record.Times == nil {
		t.Error("without the header the stamps are all there is")
	}
	r, err := pulse.Analyse(c.Record, pulse.Options{})
	q, _ := r.Get("period")
	if err != nil || !r.Flagged(pulse.CoarseTime) || math.Abs(q.X-1e-3) > 3*q.U() {
		t.Errorf("period %g, u %g, flags %v", q.X, q.U(), r.Flags)
	}
	same := mustRead(t, "Time,CH1\n"+rows(func(i int) string { return fmt.Sprintf("12.0,%.3f", volt(i)) })).Channels[0]
	if !same.Untimed {
		t.Error("stamps that are all the same tell no time")
	}
	if c = mustRead(t, "Sample interval,30 us\nTime,CH1\n"+body).Channels[0]; c.Record.Times == nil || len(c.Record.Flags) != 1 {
		t.Errorf("stamps and header disagree: flags %v", c.Record.Flags)
	}
}

func TestUntimed(t *testing.T) {
	for _, text := range []string{
		"CH1\n" + rows(func(i int) string { return fmt.Sprintf("%.4f", volt(i)) }),
		"Sequence,CH1\n" + rows(func(i int) string { return fmt.Sprintf("%d,%.4f", i, volt(i)) }),
	} {
		c := mustRead(t, text).Channels[0]
		if !c.Untimed || c.Record.Interval != 1 || len(c.Record.Volts) != count {
			t.Errorf("untimed %v, interval %g, %d samples", c.Untimed, c.Record.Interval, len(c.Record.Volts))
		}
	}
}

func TestRefusals(t *testing.T) {
	good := "Time,CH1\n" + rows(func(i int) string { return fmt.Sprintf("%.6f,%.3f", at(i), volt(i)) })
	for name, c := range map[string]struct {
		text string
		line int
		says string
	}{
		"empty":                {"", 0, "no table of numbers"},
		"words":                {"dear bench,\nthe pump runs.\n", 2, "export the waveform as CSV"},
		"binary":               {"\x00\x01\x02\x03", 1, "no text"},
		"binary later":         {"Time,CH1\n0,\x001\n", 2, "no text"},
		"word for a value":     {strings.Replace(good, "0.000000,", "0.000000,broken", 1), 52, "broken"},
		"two records":          {good + good, 242, "stands between samples"},
		"backwards":            {good + "-5.0,1\n", 242, "time runs backwards"},
		"too short":            {"Time,CH1\n0,1\n1,2\n", 2, "only 2 samples"},
		"times alone":          {"Time (s)\n0.1\n0.2\n0.3\n", 2, "no voltage"},
		"both commas":          {"a,b,c\n0,05,1,02,3,01,7,04\n0,06,1,02,3,01,7,04\n0,07,1,02,3,01,7,04\n", 4, "commas stand both"},
		"nothing but overload": {"Time;A\n0.1;∞\n0.2;∞\n0.3;∞\n", 2, "nothing but overload"},
	} {
		_, err := Read(strings.NewReader(c.text), "pump.csv")
		var e *Error
		if !errors.As(err, &e) {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if c.line > 0 && e.Line != c.line || !strings.Contains(e.Error(), c.says) || !strings.HasPrefix(e.Error(), "pump.csv") || e.Do == "" {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// endless is a file of any length, as from a broken disk.
type endless struct{ line string }

func (e endless) Read(p []byte) (int, error) {
	n := 0
	for n+len(e.line) <= len(p) {
		n += copy(p[n:], e.line)
	}
	return n, nil
}

func TestHugeFilesAreBounded(t *testing.T) {
	var e *Error
	if _, err := read(endless{"1.0,2.0\n"}, 100_000); !errors.As(err, &e) || !strings.Contains(e.What, "too long a record") {
		t.Errorf("endless samples: %v", err)
	}
	if _, err := read(endless{"1.0,"}, 100_000); !errors.As(err, &e) || !strings.Contains(e.What, "more than a megabyte") {
		t.Errorf("endless line: %v", err)
	}
	if _, err := read(endless{"words\n"}, 100_000); !errors.As(err, &e) || !strings.Contains(e.What, "no table") {
		t.Errorf("endless words: %v", err)
	}
}

type broken struct{}

func (broken) Read([]byte) (int, error) { return 0, io.ErrClosedPipe }

func TestReadersErrorsArePassedOn(t *testing.T) {
	if _, err := Read(broken{}, "x"); !errors.Is(err, io.ErrClosedPipe) {
		t.Error(err)
	}
}

// The last digit written limits what a level can be known to.
func TestResolution(t *testing.T) {
	for field, want := range map[string]float64{"8.92": 0.01, "8,9": 0.1, "-1.5e-3": 1e-4, "8.92E+01": 0.1, "12": 0, "3e2": 0, "1.5V": 0} {
		if got := lastDigit([]byte(field)); math.Abs(got-want) > 1e-12 {
			t.Errorf("%s: %g, want %g", field, got, want)
		}
	}
	c := mustRead(t, "Time,CH1 (mV)\n"+rows(func(i int) string { return fmt.Sprintf("%.6f,%.1f", at(i), 1e3*volt(i)) })).Channels[0]
	if math.Abs(c.Record.Resolution-1e-4) > 1e-12 {
		t.Errorf("resolution %g V", c.Record.Resolution)
	}
}
