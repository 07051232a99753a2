package capture

import (
	"bytes"
	"fmt"
	"slices"
	"strings"
)

// layout is how a file is laid out: where its table of samples begins, what parts its
// fields, which of them hold samples, and what the lines above tell.
type layout struct {
	sep    byte
	first  int   // index of the first line of samples
	cols   []int // fields that hold numbers in every line of samples
	joined bool  // decimal commas between commas: two fields make one number
	names  []string
	units  []unit // of each column; factor 0: not given
	header header
}

// separators in the order in which they are believed.
var separators = []byte{'\t', ';', ',', ' '}

// block is a table of numbers found with one separator.
type block struct {
	sep         byte
	first, rows int
	cols        []int
	strange     int // fields between the table's that are no numbers
}

// findLayout looks for the longest table of numbers in the first lines of a file.
func findLayout(head [][]byte) (layout, error) {
	var best block
	for _, sep := range separators {
		b := findBlock(head, sep)
		if b.size() > best.size() || b.size() == best.size() && b.strange < best.strange {
			best = b
		}
	}
	if best.rows < 2 {
		return layout{}, &Error{Line: len(head), What: fmt.Sprintf("no table of numbers within the first %d lines", len(head)),
			Do: "export the waveform as CSV: a line a sample, with time and voltage"}
	}
	if at, broken := best.broken(head); broken {
		return layout{}, &Error{Line: at, What: fmt.Sprintf("%q stands between samples", short(bytes.TrimSpace(head[at-1]))), Do: "export one record a file, with a number in every field"}
	}
	l := layout{sep: best.sep, first: best.first, cols: best.cols, header: header{}}
	l.readHeader(head)
	return l, l.decimalCommas(head)
}

// broken tells whether samples stand above the table too, and the line (from 1) that parts them from it.
func (b block) broken(head [][]byte) (line int, broken bool) {
	above := 0
	for k := range b.first {
		if b.fits(splitFields(head[k], b.sep, nil)) {
			above++
		}
	}
	return b.first, above >= 3 || above >= 1 && len(b.cols) >= 2
}

// bottoms is how many lines with numbers at the end of the head are tried as the last of the samples.
const bottoms = 40

// findBlock finds the largest table of lines that all have numbers in the same fields.
func findBlock(head [][]byte, sep byte) block {
	var best block
	if sep != ',' && !slices.ContainsFunc(head, func(l []byte) bool { return bytes.IndexByte(l, sep) >= 0 }) {
		return best
	}
	var tried [][]int
	lines := 0
	for i := len(head) - 1; i >= 0 && lines < bottoms; i-- {
		cols := numericColumns(head[i], sep)
		if len(cols) == 0 || sep != ',' && bytes.IndexByte(bytes.TrimSpace(head[i]), sep) < 0 {
			continue
		}
		lines++
		if slices.ContainsFunc(tried, func(c []int) bool { return slices.Equal(c, cols) }) {
			continue
		}
		tried = append(tried, cols)
		b := block{sep: sep, cols: cols, first: i}
		b.grow(head, i)
		if b.size() > best.size() {
			best = b
		}
	}
	return best
}

func (b block) size() int { return b.rows * len(b.cols) }

// grow takes in the lines above as long as they fit; a single one with too few numbers
// is a damaged line of the table, and told when it is read.
func (b *block) grow(head [][]byte, last int) {
	var fields [][]byte
	damaged := false
	for k := last; k >= 0; k-- {
		if len(bytes.TrimSpace(head[k])) == 0 && b.rows > 0 {
			continue
		}
		fields = splitFields(head[k], b.sep, fields)
		if !b.fits(fields) {
			if damaged || len(numericColumns(head[k], b.sep)) == 0 {
				return
			}
			damaged = true
			continue
		}
		damaged = false
		b.first = k
		b.rows++
		for c := b.cols[0]; c < b.cols[len(b.cols)-1]; c++ {
			if _, ok := number(fields[c]); !ok && len(fields[c]) > 0 {
				b.strange++
			}
		}
	}
}

func (b *block) fits(fields [][]byte) bool {
	for _, c := range b.cols {
		if c >= len(fields) {
			return false
		}
		if _, ok := number(fields[c]); !ok {
			return false
		}
	}
	return true
}

func numericColumns(line []byte, sep byte) (cols []int) {
	for c, f := range splitFields(line, sep, nil) {
		if _, ok := number(f); ok {
			cols = append(cols, c)
		}
	}
	return cols
}

// readHeader reads names, units and settings from the lines above the samples, and
// settings from fields beside the first of them.
func (l *layout) readHeader(head [][]byte) {
	l.names, l.units = make([]string, len(l.cols)), make([]unit, len(l.cols))
	rows := make([][]string, 0, l.first+1)
	for _, line := range head[:min(len(head), l.first+mostBeside)] {
		var row []string
		for _, f := range splitFields(line, l.sep, nil) {
			row = append(row, string(f))
		}
		if l.sep == ' ' && len(row) > 0 && (row[0] == "%" || row[0] == "#") {
			row = row[1:] // a remark to whoever reads the table
		}
		rows = append(rows, row)
	}
	above := rows[:l.first]
	for i := len(above) - 1; i >= 0 && i >= len(above)-6; i-- {
		if !l.nameRow(above[i]) {
			continue
		}
		if slices.ContainsFunc(l.names, func(n string) bool { return n != "" && !isIndexWord(n) }) {
			break
		}
	}
	for i, row := range above {
		l.header.read(row)
		if i+1 < len(rows) {
			l.header.readBelow(row, rows[i+1])
		}
	}
	for _, row := range rows[l.first:] {
		l.header.read(row[:min(l.cols[0], len(row))])
	}
}

// mostBeside is how many lines of samples may carry settings in the fields before them.
const mostBeside = 100

// nameRow takes units or names of the columns from a line; false: it has neither.
func (l *layout) nameRow(row []string) bool {
	var texts []string
	for _, c := range l.cols {
		if c >= len(row) {
			if len(row) > 0 && c > l.cols[0] {
				texts = append(texts, "")
				continue
			}
			return false
		}
		texts = append(texts, row[c])
	}
	text, units := 0, 0
	for _, s := range texts {
		if s == "" {
			continue
		}
		if _, ok := number([]byte(s)); !ok {
			text++
		}
		if _, ok := unitOf(s); ok || isIndexWord(s) {
			units++
		}
	}
	if text == 0 {
		return false
	}
	if filled := len(slices.DeleteFunc(slices.Clone(texts), func(s string) bool { return s == "" })); units == filled && !(units == 1 && isIndexWord(texts[0])) {
		for i, s := range texts {
			if u, ok := unitOf(s); ok && l.units[i].factor == 0 {
				l.units[i] = u
			}
			if isIndexWord(s) && l.names[i] == "" {
				l.names[i] = s
			}
		}
		return true
	}
	for i, s := range texts {
		l.name(i, s)
	}
	return true
}

// name takes a column's name, and the unit in it: "CH1 (mV)", "Time [s]", "C1 in V".
func (l *layout) name(i int, s string) {
	if l.names[i] != "" && !isIndexWord(l.names[i]) {
		return
	}
	cut := strings.IndexAny(s, "([{")
	if k := strings.LastIndex(s, " in "); cut < 0 && k >= 0 {
		cut = k
	}
	if cut < 0 {
		if k := strings.LastIndexAny(s, "_/"); k > 0 {
			cut = k
		}
	}
	if cut >= 0 {
		text := strings.TrimPrefix(strings.TrimLeft(s[cut:], "_/"), " in ")
		if u, ok := unitOf(text); ok {
			if l.units[i].factor == 0 {
				l.units[i] = u
			}
			s = strings.TrimSpace(s[:cut])
		}
	}
	if _, ok := unitOf(s); ok && len(s) > 1 && l.units[i].factor == 0 {
		l.units[i], _ = unitOf(s)
	}
	if l.names[i] == "" || !isIndexWord(s) {
		l.names[i] = s
	}
}

func plain(s string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case r >= 'A' && r <= 'Z':
			return r + 'a' - 'A'
		case r >= 'a' && r <= 'z' || r >= '0' && r <= '9':
			return r
		}
		return -1
	}, s)
}

func isIndexWord(s string) bool {
	switch plain(s) {
	case "sequence", "index", "sample", "samples", "point", "points", "no", "nr", "num", "number", "x", "xaxis":
		return true
	}
	return s == "#" || s == "n"
}

func isTimeWord(s string) bool {
	p := plain(s)
	return p == "t" || strings.HasPrefix(p, "time") || strings.HasSuffix(p, "time") || strings.HasPrefix(p, "second") || strings.HasPrefix(p, "zeit") || p == "temps" || p == "timestamp"
}

// decimalCommas tells decimal commas between comma-separated fields from two columns of
// whole numbers, or refuses.
func (l *layout) decimalCommas(head [][]byte) error {
	if l.sep != ',' || len(l.cols)%2 != 0 || l.cols[len(l.cols)-1] != len(l.cols)-1 {
		return nil
	}
	padded := 0
	for k := l.first; k < len(head); k++ {
		fields := splitFields(head[k], ',', nil)
		if len(fields) < len(l.cols) || len(fields) > len(l.cols)+1 {
			continue
		}
		for i := range l.cols {
			f := fields[i]
			if bytes.ContainsAny(f, ".,") {
				return nil
			}
			digits := bytes.TrimLeft(f, "+-")
			if i%2 == 1 && len(digits) > 1 && digits[0] == '0' {
				padded = k + 1
			}
		}
	}
	filled := 0
	for _, n := range l.names {
		if n != "" {
			filled++
		}
	}
	switch {
	case padded == 0 && !(filled > 0 && 2*filled == len(l.cols)):
		return nil // whole numbers
	case 2*filled == len(l.cols) || len(l.cols) == 2:
		l.join()
		return nil
	}
	return &Error{Line: padded, What: "commas stand both between fields and inside numbers; which is which cannot be told", Do: "export with a decimal point, or with semicolons between fields"}
}

// join makes one column of each two.
func (l *layout) join() {
	l.joined = true
	n := len(l.cols) / 2
	l.cols = l.cols[:n]
	l.names, l.units = l.names[:n], l.units[:n]
}
