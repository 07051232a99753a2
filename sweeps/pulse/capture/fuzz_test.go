package capture

import (
	"bytes"
	"errors"
	"math"
	"strings"
	"testing"

	"nightbench/sweeps/pulse"
)

// Whatever the file, it is refused with words or gives waveforms that can be analysed.
func FuzzRead(f *testing.F) {
	for _, l := range layouts {
		f.Add([]byte(l.text[:min(len(l.text), 1500)]))
	}
	f.Add([]byte("\xff\xfeT\x001\x00"))
	f.Add([]byte("Time;A\n0,1;∞\n0,2;1,0\n0,3;∞\n"))
	f.Fuzz(func(t *testing.T, data []byte) {
		file, err := read(bytes.NewReader(data), 100_000)
		if err != nil {
			var e *Error
			if !errors.As(err, &e) || e.What == "" {
				t.Fatalf("no words: %v", err)
			}
			return
		}
		if len(file.Channels) == 0 || file.ReadAs == "" || strings.Contains(file.ReadAs, "%!") {
			t.Fatalf("%d channels, read as %q", len(file.Channels), file.ReadAs)
		}
		for _, c := range file.Channels {
			analysable(t, c)
		}
	})
}

func analysable(t *testing.T, c Channel) {
	t.Helper()
	for i, v := range c.Record.Volts {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			t.Fatalf("%s: sample %d is %g", c.Name, i, v)
		}
	}
	r, err := pulse.Analyse(c.Record, pulse.Options{})
	if err != nil {
		return // too few samples, say; it says so
	}
	for _, q := range r.Quantities {
		if err := q.Check(); err != nil {
			t.Fatalf("%s: %s: %v", c.Name, q.Name, err)
		}
	}
}
