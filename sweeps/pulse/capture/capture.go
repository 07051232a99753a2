// Package capture reads waveforms as scopes export them: text with a time and one
// or more channels, a header block of any kind, or start and increment instead of
// times, metadata in leading columns, comma, semicolon, tab or blanks between
// fields, decimal point or decimal comma. It never guesses silently: what the file
// was taken for is said in words, and what cannot be told is refused with its line.
package capture

import (
	"fmt"
	"io"
	"strings"

	"nightbench/sweeps/pulse"
)

// File is a capture as it was read.
type File struct {
	// ReadAs says in words what the file was taken for.
	ReadAs   string
	Channels []Channel
}

// Channel is one waveform of a capture.
type Channel struct {
	Name   string
	Unit   string // "V" where the file gives none; "A" of a current probe
	Record pulse.Record
	// Untimed: the file numbers its samples but does not say how far apart they are;
	// Record.Interval is 1, and every time found is in samples.
	Untimed bool
	Flags   []pulse.Flag // about the capture, not bearing on any one quantity
}

// Error is what is wrong with a file: where, what, and what would do.
type Error struct {
	File string
	Line int // from 1; 0: the file as a whole
	What string
	Do   string // what would do instead
}

func (e *Error) Error() string {
	var b strings.Builder
	b.WriteString(e.File)
	if e.Line > 0 {
		fmt.Fprintf(&b, ":%d", e.Line)
	}
	b.WriteString(": " + e.What)
	if e.Do != "" {
		b.WriteString("; " + e.Do)
	}
	return b.String()
}

// mostValues bounds what a file may make us hold: 32 million numbers are 256 MB. Scopes
// export at most some ten million samples.
const mostValues = 32 << 20

// Read reads a capture; name is what errors call it. Its error is an *Error, or that of the reader.
func Read(r io.Reader, name string) (File, error) {
	f, err := read(r, mostValues)
	if e, ok := err.(*Error); ok {
		e.File = name
	}
	return f, err
}

func read(r io.Reader, most int) (File, error) {
	lines, err := newLines(r)
	if err != nil {
		return File{}, err
	}
	head, err := lines.head()
	if err != nil {
		return File{}, err
	}
	l, err := findLayout(head)
	if err != nil {
		return File{}, err
	}
	t := &table{layout: l, most: most}
	for _, text := range head[l.first:] {
		if err := t.take(text); err != nil {
			return File{}, err
		}
	}
	for lines.scan() {
		if err := t.take(lines.text()); err != nil {
			return File{}, err
		}
	}
	if err := lines.err(); err != nil {
		return File{}, err
	}
	if err := t.end(); err != nil {
		return File{}, err
	}
	return t.file()
}
