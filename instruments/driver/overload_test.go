package driver

import (
	"math"
	"testing"

	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
)

// A reply that a family uses for overload has no value: never a plausible 0.
func TestOverloadWordsHaveNoValue(t *testing.T) {
	l := dialect.Line{Scale: 1, Overload: []string{"OL", "-OL"}}
	for reply, negative := range map[string]bool{"OL": false, "-OL": true} {
		n, err := parseNumber(l, reply)
		if err != nil || n.Outcome != scpi.Overload || !math.IsNaN(n.Value) || n.Negative != negative || n.Raw != reply {
			t.Errorf("%q: %+v, %v", reply, n, err)
		}
	}
}
