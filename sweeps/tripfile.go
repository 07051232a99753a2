package sweeps

import (
	"encoding"
	"fmt"
	"slices"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// tripping are the quantities whose limits this version watches.
var tripping = []Quantity{MotorCurrent, SupplyCurrent, SupplyVoltage, AverageVoltage}

// trips reads the limits that end a run, one key a quantity.
func trips(t *userfile.Table) []Trip {
	var out []Trip
	for _, q := range tripping {
		t.Known(string(q))
	}
	for _, key := range t.Keys() {
		switch q := Quantity(key); {
		case slices.Contains(tripping, q):
			if trip, ok := tripAt(t, q); ok {
				out = append(out, trip)
			}
		case q.Known():
			t.NotYet(key, fmt.Sprintf("trips are watched on %s, %s, %s and %s", tripping[0], tripping[1], tripping[2], tripping[3]))
		}
	}
	return out
}

// tripAt reads { limit = "0.8 A", for = "200 ms" }. Without for it trips at the first reading above.
func tripAt(t *userfile.Table, q Quantity) (Trip, bool) {
	trip := Trip{Quantity: q}
	if !t.IsTable(string(q)) {
		like := `{ limit = "0.8 A", for = "200 ms" }`
		if q.Unit() == si.Volt {
			like = `{ limit = "13 V", for = "200 ms" }`
		}
		t.Correct(string(q), like, "give the limit and for how long it may be exceeded")
		return trip, false
	}
	in := t.Table(string(q))
	ok := false
	if q.Unit() == si.Ampere {
		ok = tripLimit[si.Current](in, &trip.Limit)
	} else {
		ok = tripLimit[si.Voltage](in, &trip.Limit)
	}
	duration(in.Optional(), "for", &trip.For, notNegative)
	return trip, ok
}

func tripLimit[T any, P interface {
	*T
	number
}](t *userfile.Table, limit *float64) bool {
	var v T
	ok := signed(t, "limit", P(&v), positive)
	*limit = P(&v).SI()
	return ok
}

// accept reads the limits for comparing runs, one key a quantity.
func accept(t *userfile.Table) map[Quantity]si.Limit {
	out := map[Quantity]si.Limit{}
	for _, k := range Quantities {
		key := string(k.Name)
		t.Known(key)
		var l si.Limit
		if !t.Optional().Text(key, encoding.TextUnmarshaler(&l)) {
			continue
		}
		switch {
		case l.Relative == 0 && l.Absolute == 0:
			t.Fail(key, "has to be above zero: no two measurements agree exactly")
		case l.Absolute != 0 && l.Unit != k.Unit:
			t.Fail(key, fmt.Sprintf("%s is in %s, the limit in %s; %s", key, unitWords(k.Unit), unitWords(l.Unit), limitLike(k.Unit)))
		default:
			out[k.Name] = l
		}
	}
	if len(out) == 0 {
		return nil
	}
	return out
}

// unitWords name a unit in a sentence.
func unitWords(u si.Unit) string {
	if u == si.One {
		return "percentage points (a ratio)"
	}
	return string(u)
}

func limitLike(u si.Unit) string {
	switch u {
	case si.One:
		return `write it like "1 points" or "2 %"`
	case si.Volt, si.Ampere, si.Ohm, si.Second, si.Hertz:
		return fmt.Sprintf(`write it like "2 %%" or "0.1 %s"`, u)
	}
	return `write it like "2 %"`
}
