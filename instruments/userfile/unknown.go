package userfile

import (
	"slices"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

// unknown is a failure for every key that nobody asked for. Its missing is the key that was probably meant.
func (f *File) unknown() []*failure {
	var out []*failure
	f.root.unasked(&out)
	return out
}

func (t *Table) unasked(out *[]*failure) {
	for _, key := range t.node.keys {
		if _, known := t.asked[key]; !known {
			*out = append(*out, t.unknownKey(key))
		}
	}
	for _, key := range t.node.keys {
		for _, sub := range t.tables[key] {
			sub.unasked(out)
		}
	}
}

func (t *Table) unknownKey(key string) *failure {
	n := t.node.under[key]
	accepted := t.accepted()
	near := Nearest(key, accepted)
	e := &failure{Error: t.mistake(key, "unknown "+tableOrKey(n)), table: t.node, missing: near}
	if near != "" {
		e.Want += `; did you mean "` + near + `"?`
		if n.kind != unstable.Table && n.kind != unstable.ArrayTable {
			e.Fix = near + " = " + shown(n.raw)
		}
	}
	if len(accepted) > 0 {
		e.Want += " (accepted here: " + strings.Join(accepted, ", ") + ")"
	}
	return e
}

// accepted are the keys that were asked for, sorted.
func (t *Table) accepted() []string {
	var keys []string
	for k, ok := range t.asked {
		if ok {
			keys = append(keys, k)
		}
	}
	slices.Sort(keys)
	return keys
}

func tableOrKey(n *node) string {
	if n.kind == unstable.Table && n.made != byBraces || n.kind == unstable.ArrayTable {
		return "table"
	}
	return "key"
}

// Nearest is the word of accepted that word is most likely a misspelling of;
// empty where none is near (at most a third of its letters wrong) or two are equally near.
func Nearest(word string, accepted []string) string {
	best, least := "", 1+(len([]rune(word))+1)/3
	for _, a := range accepted {
		switch d := distance(strings.ToLower(word), strings.ToLower(a)); {
		case a == word:
		case d < least:
			best, least = a, d
		case d == least:
			best = ""
		}
	}
	return best
}

// distance counts the letters to insert, delete, replace or swap with their
// neighbour (restricted Damerau–Levenshtein distance).
func distance(a, b string) int {
	x, y := []rune(a), []rune(b)
	if len(x) > 64 || len(y) > 64 {
		return 64
	}
	d := make([][]int, len(x)+1)
	for i := range d {
		d[i] = make([]int, len(y)+1)
		d[i][0] = i
	}
	for j := range y {
		d[0][j+1] = j + 1
	}
	for i := 1; i <= len(x); i++ {
		for j := 1; j <= len(y); j++ {
			cost := 1
			if x[i-1] == y[j-1] {
				cost = 0
			}
			d[i][j] = min(d[i-1][j]+1, d[i][j-1]+1, d[i-1][j-1]+cost)
			if i > 1 && j > 1 && x[i-1] == y[j-2] && x[i-2] == y[j-1] {
				d[i][j] = min(d[i][j], d[i-2][j-2]+1)
			}
		}
	}
	return d[len(x)][len(y)]
}
