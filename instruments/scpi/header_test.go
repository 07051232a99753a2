package scpi

import (
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// spell writes a mnemonic of a pattern in its long or short form, each letter
// in either case.
func spell(t *rapid.T, word string) string {
	if rapid.Bool().Draw(t, "short") {
		word = strings.TrimRightFunc(word, func(r rune) bool { return r >= 'a' && r <= 'z' })
	}
	var b strings.Builder
	for _, r := range word {
		if rapid.Bool().Draw(t, "lower") {
			b.WriteString(strings.ToLower(string(r)))
		} else {
			b.WriteString(strings.ToUpper(string(r)))
		}
	}
	return b.String()
}

// Every spelling a manual allows reaches the header, alone and after another
// unit whose path is the same (rules of the Agilent 665xA programming guide
// pp. 12-14).
func TestAnySpellingReachesTheHeader(t *testing.T) {
	words := []string{"SOURce", "VOLTage", "LEVel", "IMMediate", "AMPLitude", "MODE", "DC"}
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, len(words)).Draw(t, "words")
		order := rapid.Permutation(words).Draw(t, "order")[:n]
		must := rapid.IntRange(0, n-1).Draw(t, "must")
		var pattern strings.Builder
		var sent []string
		for i, w := range order {
			optional := i != must && rapid.Bool().Draw(t, "optional")
			switch {
			case optional && i < must:
				pattern.WriteString("[" + w + ":]")
			case optional:
				pattern.WriteString("[:" + w + "]")
			case i < must:
				pattern.WriteString(w + ":")
			case i == must:
				pattern.WriteString(w)
			default:
				pattern.WriteString(":" + w)
			}
			if !optional || rapid.Bool().Draw(t, "in") {
				sent = append(sent, spell(t, w))
			}
		}
		header := strings.Join(sent, ":")
		last := strings.Join(sent[len(sent)-1:], "")
		d := NewDevice(self, 10)
		calls := 0
		d.Set(pattern.String(), func(*Call) error { calls++; return nil })
		colon := rapid.SampledFrom([]string{"", ":"}).Draw(t, "colon")
		message := colon + header + ";" + last + ";*OPC;" + last + ";:" + header
		d.Execute(t.Context(), []byte(message))
		if calls != 4 || d.Queue.Len() != 0 {
			t.Fatalf("pattern %s: %q reached it %d times of 4, then %v", pattern.String(), message, calls, d.Queue.Next())
		}
	})
}

// A mnemonic is in exactly its long or its short form, nothing in between
// (Siglent SPD3000X QuickStart p. 27).
func TestNothingBetweenShortAndLong(t *testing.T) {
	const long = "AMPLITUDE"
	d := NewDevice(self, 20)
	d.Set("AMPLitude", func(*Call) error { return nil })
	for n := 1; n <= len(long); n++ {
		d.Execute(t.Context(), []byte(long[:n]))
		if want, f := n == 4 || n == len(long), d.Queue.Next(); (f.Code == 0) != want {
			t.Errorf("%s: %v", long[:n], f)
		}
	}
}
