// Package userfile reads the TOML files people write, strictly: whatever is
// unknown, missing, twice there or not understood is an error that names file,
// line, key, what was found and what would do. Errors are collected, so that
// one reading tells them all. Nothing is ignored and nothing is corrected.
package userfile

import (
	"fmt"
	"slices"
	"strings"
	"unicode"
)

// Error is one mistake in a file. Line is 0 where the file as a whole is meant;
// Key and Found are empty where there is none.
type Error struct {
	File  string
	Line  int
	Key   string // dotted, elements of an array of tables counted from 1: "meter[2].reads"
	Found string // as written, quotes included, shortened
	Want  string // what is wrong, and what would do
	Fix   string // the corrected line, where there is an obvious one
	Err   error  // cause, or nil
}

// Error is one line: bench.toml:12: supply.max_voltage = "13": "13" has no unit; …
func (e *Error) Error() string {
	var b strings.Builder
	b.WriteString(e.File)
	if e.Line > 0 {
		fmt.Fprintf(&b, ":%d", e.Line)
	}
	b.WriteString(": ")
	if e.Key != "" {
		b.WriteString(e.Key)
		if e.Found != "" {
			b.WriteString(" = " + e.Found)
		}
		b.WriteString(": ")
	}
	b.WriteString(e.Want)
	if e.Fix != "" {
		b.WriteString("; the line would be: " + e.Fix)
	}
	return b.String()
}

// Unwrap is the cause.
func (e *Error) Unwrap() error { return e.Err }

// Errors are all mistakes of a reading, in the order of their lines.
// errors.As finds the first *Error in it.
type Errors []*Error

// maxTold is how many mistakes a message tells; a wrong file can have thousands.
const maxTold = 20

// Error is one line for each mistake.
func (es Errors) Error() string {
	var lines []string
	for i, e := range es {
		if i == maxTold {
			lines = append(lines, fmt.Sprintf("%s: and %d more", e.File, len(es)-maxTold))
			break
		}
		lines = append(lines, e.Error())
	}
	return strings.Join(lines, "\n")
}

// Unwrap is every mistake.
func (es Errors) Unwrap() []error {
	out := make([]error, len(es))
	for i, e := range es {
		out[i] = e
	}
	return out
}

// Join puts the mistakes of several readings together, file by file. Errors
// that are no mistakes in a file are refused: they are returned as they are.
func Join(errs ...error) error {
	var all Errors
	for _, err := range errs {
		switch e := err.(type) {
		case nil:
		case *Error:
			all = append(all, e)
		case Errors:
			all = append(all, e...)
		default:
			return err
		}
	}
	return all.err()
}

// err is es as an error: nil for none.
func (es Errors) err() error {
	if len(es) == 0 {
		return nil
	}
	return es
}

// byLine sorts the mistakes of one file.
func (es Errors) byLine() Errors {
	out := slices.Clone(es)
	slices.SortStableFunc(out, func(a, b *Error) int { return a.Line - b.Line })
	return out
}

// maxFound is how much of a value a message shows, in characters.
const maxFound = 60

// shown is a value as a message shows it: on one line, bounded, printable.
func shown(raw string) string {
	s := strings.Map(func(r rune) rune {
		if !unicode.IsPrint(r) && !unicode.IsSpace(r) {
			return unicode.ReplacementChar
		}
		return r
	}, raw)
	s = strings.Join(strings.Fields(s), " ")
	if r := []rune(s); len(r) > maxFound {
		return string(r[:maxFound]) + "…"
	}
	return s
}
