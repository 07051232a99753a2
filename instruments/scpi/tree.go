package scpi

import (
	"context"
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"
)

// Tree is the table of headers an instrument knows. Headers are registered
// as manuals print them:
//
//	[SOURce:]VOLTage[:LEVel][:IMMediate][:AMPLitude]
//	OUTPut<1-3>[:STATe]
//	*IDN
//
// Capitals are the short form; brackets hold what may be left out; <n> stands
// for a numeric suffix from 1 up, <1-3> for one in that range, and a suffix
// left out is 1. Set and Get panic on a pattern that is malformed or collides
// with another, since that is a mistake in the program.
type Tree struct {
	root *node
}

// node is a place in the tree of headers, with every optional mnemonic
// spelled out: a pattern with two optional mnemonics leads to four nodes.
type node struct {
	edges []*edge
	set   *entry
	get   *entry
}

type edge struct {
	mnemonic
	to *node
}

// mnemonic is one word of a pattern.
type mnemonic struct {
	long, short string // in capitals
	low, high   int    // the range of the numeric suffix; both 0: none
}

// entry is what a header does and the parameters it takes.
type entry struct {
	run  func(*Call) (string, error)
	args []Arg
}

// Call is one header being carried out.
type Call struct {
	Context context.Context
	Header  string // in full, as understood
	Suffix  []int  // of each mnemonic with a suffix, in order

	args []any
}

// Set registers what the command form of a header does. The parameters are
// checked against args before run is called. An error of run is queued: a
// Fault as it is, any other as -300.
func (t *Tree) Set(pattern string, run func(*Call) error, args ...Arg) {
	e := &entry{run: func(c *Call) (string, error) { return "", run(c) }, args: args}
	t.register(pattern, func(n *node) **entry { return &n.set }, e)
}

// Get registers what the query form of a header answers, without the ? and
// without the terminator.
func (t *Tree) Get(pattern string, run func(*Call) (string, error), args ...Arg) {
	t.register(pattern, func(n *node) **entry { return &n.get }, &entry{run: run, args: args})
}

// Value registers both forms of a numeric setting. The query answers in NR3
// form and takes MINimum, MAXimum or DEFault, as in VOLT? MAX.
func (t *Tree) Value(pattern string, n Numeric, get func(*Call) float64, set func(*Call, float64) error) {
	t.Set(pattern, func(c *Call) error { return set(c, c.Number(0)) }, n)
	t.Get(pattern, func(c *Call) (string, error) {
		if !c.Has(0) {
			return NR3(get(c)), nil
		}
		return NR3(c.Number(0)), nil
	}, limitWord{n})
}

func (t *Tree) register(pattern string, slot func(*node) **entry, e *entry) {
	if t.root == nil {
		t.root = &node{}
	}
	spellings, err := expand(pattern)
	if err != nil {
		panic(fmt.Sprintf("scpi: pattern %q: %v", pattern, err))
	}
	for _, words := range spellings {
		at := t.root
		for _, w := range words {
			at = at.child(pattern, w)
		}
		if s := slot(at); *s != nil {
			panic(fmt.Sprintf("scpi: pattern %q is registered twice", pattern))
		} else {
			*s = e
		}
	}
}

// child finds or makes the edge for a word.
func (n *node) child(pattern string, w mnemonic) *node {
	for _, e := range n.edges {
		if e.mnemonic == w {
			return e.to
		}
		if e.overlaps(w) {
			panic(fmt.Sprintf("scpi: pattern %q: %s cannot be told from %s", pattern, w.long, e.long))
		}
	}
	e := &edge{mnemonic: w, to: &node{}}
	n.edges = append(n.edges, e)
	return e.to
}

// overlaps says whether two different words can't be told apart. The same
// word with and without a suffix, or with another range, can: by where it
// leads.
func (m mnemonic) overlaps(w mnemonic) bool {
	if m.long == w.long && m.short == w.short {
		return false
	}
	return m.long == w.long || m.long == w.short || m.short == w.long || m.short == w.short
}

// match compares a word as sent, in capitals: exactly the long or the short
// form, and a suffix only where there may be one. ok with a bad suffix is
// reported by inRange.
func (m mnemonic) match(word string) (suffix int, ok, inRange bool) {
	if m.high == 0 {
		return 0, word == m.long || word == m.short, true
	}
	name := strings.TrimRight(word, "0123456789")
	if name != m.long && name != m.short {
		return 0, false, false
	}
	if name == word {
		return 1, true, m.low <= 1
	}
	suffix, err := strconv.Atoi(word[len(name):])
	return suffix, true, err == nil && suffix >= m.low && suffix <= m.high
}

var wordPattern = regexp.MustCompile(`^(\*?)([A-Z][A-Z0-9_]*)([a-z]*)(?:<(?:n|(\d+)-(\d+))>)?$`)

func parseMnemonic(text string) (m mnemonic, err error) {
	f := wordPattern.FindStringSubmatch(text)
	if f == nil {
		return m, fmt.Errorf("%q is no mnemonic such as VOLTage or OUTPut<1-3>", text)
	}
	m = mnemonic{long: f[1] + strings.ToUpper(f[2]+f[3]), short: f[1] + f[2]}
	if strings.HasSuffix(text, "<n>") {
		m.low, m.high = 1, 1<<30
	} else if f[5] != "" {
		m.low, _ = strconv.Atoi(f[4])
		m.high, _ = strconv.Atoi(f[5])
	}
	return m, nil
}

// maxOptional bounds the spellings of a pattern to 256.
const maxOptional = 8

// expand lists every spelling of a pattern, optional words in and out.
func expand(pattern string) ([][]mnemonic, error) {
	if strings.Count(pattern, "[") > maxOptional {
		return nil, fmt.Errorf("more than %d optional parts", maxOptional)
	}
	open := strings.IndexByte(pattern, '[')
	if open < 0 {
		return spelling(pattern)
	}
	length := strings.IndexByte(pattern[open:], ']')
	if length < 0 || strings.Contains(pattern[open+1:open+length], "[") {
		return nil, fmt.Errorf("brackets do not pair")
	}
	before, inside, after := pattern[:open], pattern[open+1:open+length], pattern[open+length+1:]
	with, err := expand(before + inside + after)
	if err != nil {
		return nil, err
	}
	without, err := expand(before + after)
	return append(with, without...), err
}

func spelling(pattern string) ([][]mnemonic, error) {
	words := []mnemonic{}
	for _, text := range strings.Split(strings.TrimPrefix(pattern, ":"), ":") {
		m, err := parseMnemonic(text)
		if err != nil {
			return nil, err
		}
		words = append(words, m)
	}
	return [][]mnemonic{words}, nil
}

// find looks a header up and gives the numeric suffixes in it. The error is a
// Fault.
func (t *Tree) find(words []string, query bool) (*entry, []int, error) {
	if t.root == nil {
		return nil, nil, NewFault(UndefinedHeader, "")
	}
	return t.root.find(words, query, nil)
}

// find tries the edges that fit the first word, in the order of registration.
func (n *node) find(words []string, query bool, suffixes []int) (*entry, []int, error) {
	if len(words) == 0 {
		if e := n.entry(query); e != nil {
			return e, suffixes, nil
		}
		return nil, nil, NewFault(UndefinedHeader, "")
	}
	worst := NewFault(UndefinedHeader, "")
	for _, edge := range n.edges {
		suffix, ok, inRange := edge.match(words[0])
		switch {
		case !ok:
			continue
		case !inRange:
			worst = NewFault(HeaderSuffixRange, words[0])
			continue
		}
		found := suffixes
		if edge.high != 0 {
			found = append(slices.Clip(suffixes), suffix)
		}
		e, found, err := edge.to.find(words[1:], query, found)
		if err == nil {
			return e, found, nil
		}
		if f := asFault(err); f.Code == HeaderSuffixRange {
			worst = f
		}
	}
	return nil, nil, worst
}

func (n *node) entry(query bool) *entry {
	if query {
		return n.get
	}
	return n.set
}

// MatchHeader says whether text is a header that pattern allows, such as the
// function names in FUNC "VOLT:DC".
func MatchHeader(pattern, text string) bool {
	var t Tree
	t.Set(pattern, nil)
	u, ok, err := NewParser([]byte(text)).Next()
	if err != nil || !ok || u.Query || len(u.Params) > 0 {
		return false
	}
	_, _, err = t.find(u.Nodes, false)
	return err == nil
}

// ShortForm computes the short form of a mnemonic by the rule: its first four
// letters, or three if the fourth is a vowel and the word is longer than four
// (SCPI-1999 volume 1 section 6.2.1, from memory). Makers' manuals that print
// another one are to be believed.
func ShortForm(long string) string {
	long = strings.ToUpper(long)
	switch {
	case len(long) <= 4:
		return long
	case strings.IndexByte("AEIOU", long[3]) >= 0:
		return long[:3]
	}
	return long[:4]
}
