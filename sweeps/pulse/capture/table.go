package capture

import (
	"bytes"
	"fmt"
	"math"
)

// table gathers the samples line by line.
type table struct {
	layout
	most   int // values held at most
	line   int // lines taken, from the first of samples
	n      int // lines of samples
	values [][]float64
	ended  []int     // line at which a column stopped giving values; 0: it has not
	over   []int     // overloads of each column
	digit  []float64 // the coarsest last digit of each column
	blank  int       // first line without samples after the table; 0: none
	cut    bool      // the last line was cut short and left out
	short  int       // line that had too few fields
	fields [][]byte
}

// take adds a line.
func (t *table) take(text []byte) error {
	t.line++
	at := t.first + t.line
	if len(bytes.TrimSpace(text)) == 0 {
		return nil
	}
	t.fields = splitFields(text, t.sep, t.fields)
	if t.joined && !t.rejoin() {
		return &Error{Line: at, What: fmt.Sprintf("%d fields where decimal commas make two of each number", len(t.fields)), Do: "export with semicolons between fields"}
	}
	if t.values == nil {
		t.values, t.ended, t.over = make([][]float64, len(t.cols)), make([]int, len(t.cols)), make([]int, len(t.cols))
		t.digit = make([]float64, len(t.cols))
	}
	if t.short > 0 {
		return &Error{Line: t.short, What: fmt.Sprintf("fewer than %d values", len(t.cols)), Do: "export again: the file is damaged"}
	}
	given, missing := 0, 0
	for _, c := range t.cols {
		if c >= len(t.fields) {
			missing++
		} else if _, ok := number(t.fields[c]); ok {
			given++
		}
	}
	switch {
	case given == 0 && (missing > 0 || t.empty()):
		if t.blank == 0 {
			t.blank = at
		}
		return nil // remarks below the samples
	case missing > 0:
		t.short = at // unless it is the last line
		return nil
	}
	return t.row(at)
}

// row adds the values of a full line.
func (t *table) row(at int) error {
	for i, c := range t.cols {
		f := t.fields[c]
		x, ok := number(f)
		switch {
		case ok && t.ended[i] > 0:
			return &Error{Line: t.ended[i], What: fmt.Sprintf("no value in field %d, though later lines have one", c+1), Do: "export again without gaps"}
		case ok:
			t.values[i] = append(t.values[i], x)
			if t.n < headLines {
				t.digit[i] = max(t.digit[i], lastDigit(f))
			}
			if math.IsInf(x, 0) {
				t.over[i]++
			}
		case len(f) == 0 && t.n > 0:
			if t.ended[i] == 0 {
				t.ended[i] = at
			}
		case i == 0 && t.remark():
			if t.blank == 0 {
				t.blank = at
			}
			return nil
		default:
			return &Error{Line: at, What: fmt.Sprintf("%q in field %d is no number", short(f), c+1), Do: "export the samples of one record only, a line each"}
		}
	}
	if t.blank > 0 {
		return &Error{Line: t.blank, What: "words between samples", Do: "export one record a file"}
	}
	t.n++
	if t.n*len(t.cols) > t.most {
		return &Error{Line: at, What: fmt.Sprintf("more than %d values: too long a record to hold", t.most), Do: "export a shorter stretch, or one channel"}
	}
	return nil
}

// empty tells whether a line has nothing where numbers belong.
func (t *table) empty() bool {
	for _, c := range t.cols {
		if len(t.fields[c]) > 0 {
			return false
		}
	}
	return true
}

// remark tells whether a line has words where numbers belong, in all its fields.
func (t *table) remark() bool {
	for _, c := range t.cols {
		if _, ok := number(t.fields[c]); ok {
			return false
		}
	}
	return true
}

// rejoin makes one field of each two around a decimal comma.
func (t *table) rejoin() bool {
	n := len(t.fields)
	if n > 0 && len(t.fields[n-1]) == 0 {
		n--
	}
	if n%2 != 0 {
		return false
	}
	for i := 0; i < n; i += 2 {
		t.fields[i/2] = bytes.Join([][]byte{t.fields[i], t.fields[i+1]}, []byte{'.'})
	}
	t.fields = t.fields[:n/2]
	return true
}

// end settles what the last line was.
func (t *table) end() error {
	t.cut = t.short > 0
	if t.n < 3 {
		return &Error{Line: t.first + 1, What: fmt.Sprintf("only %d samples", t.n), Do: "export a record of at least two whole periods"}
	}
	return nil
}

func short(f []byte) string {
	if len(f) > 24 {
		return string(f[:24]) + "…"
	}
	return string(f)
}
