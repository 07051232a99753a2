package capture

import (
	"bufio"
	"bytes"
	"errors"
	"io"
	"unicode/utf16"
	"unicode/utf8"
)

const (
	longestLine = 1 << 20 // bytes; a table of samples has short lines
	headLines   = 4096    // looked at to find out what the file is
	headBytes   = 1 << 20
)

// lines gives a text line by line, whatever ends them and in UTF-8 or UTF-16.
type lines struct {
	s *bufio.Scanner
	n int // the line last given, from 1
}

func newLines(r io.Reader) (*lines, error) {
	b := bufio.NewReaderSize(r, 64<<10)
	mark, err := b.Peek(4)
	if err != nil && err != io.EOF {
		return nil, err
	}
	var text io.Reader = b
	switch {
	case len(mark) >= 2 && mark[0] == 0xff && mark[1] == 0xfe:
		text = &wide{r: b, low: 0, high: 1}
	case len(mark) >= 2 && mark[0] == 0xfe && mark[1] == 0xff:
		text = &wide{r: b, low: 1, high: 0}
	case bytes.HasPrefix(mark, []byte("\xef\xbb\xbf")):
		b.Discard(3) // peeked at, so it is there
	case bytes.IndexByte(mark, 0) >= 0:
		return nil, notText(1)
	}
	l := &lines{s: bufio.NewScanner(text)}
	l.s.Buffer(make([]byte, 64<<10), longestLine)
	l.s.Split(splitLines)
	return l, nil
}

func notText(line int) error {
	return &Error{Line: line, What: "this is no text: it holds bytes of value 0", Do: "let the scope export the waveform as CSV"}
}

// scan moves to the next line.
func (l *lines) scan() bool {
	if !l.s.Scan() {
		return false
	}
	l.n++
	return true
}

// text is the line, valid until the next scan.
func (l *lines) text() []byte { return l.s.Bytes() }

func (l *lines) err() error {
	if errors.Is(l.s.Err(), bufio.ErrTooLong) {
		return &Error{Line: l.n + 1, What: "a line of more than a megabyte", Do: "export the waveform as a table with one line a sample"}
	}
	return l.s.Err()
}

// head returns copies of the first lines, enough to tell what the file is.
func (l *lines) head() ([][]byte, error) {
	var head [][]byte
	size := 0
	for len(head) < headLines && size < headBytes && l.scan() {
		line := bytes.Clone(l.text())
		if bytes.IndexByte(line, 0) >= 0 {
			return nil, notText(l.n)
		}
		head = append(head, line)
		size += len(line)
	}
	return head, l.err()
}

// splitLines splits at LF, CR LF and CR.
func splitLines(data []byte, atEOF bool) (advance int, token []byte, err error) {
	i := bytes.IndexAny(data, "\r\n")
	switch {
	case i >= 0 && data[i] == '\n':
		return i + 1, data[:i], nil
	case i >= 0 && i+1 < len(data):
		if data[i+1] == '\n' {
			return i + 2, data[:i], nil
		}
		return i + 1, data[:i], nil
	case i >= 0 && atEOF:
		return i + 1, data[:i], nil
	case atEOF && len(data) > 0:
		return len(data), data, nil
	}
	return 0, nil, nil
}

// wide turns UTF-16 into UTF-8.
type wide struct {
	r         io.Reader
	low, high int // where in a pair the bytes stand
	first     uint16
	out       []byte
}

func (w *wide) Read(p []byte) (int, error) {
	for len(w.out) == 0 {
		var pair [2]byte
		if _, err := io.ReadFull(w.r, pair[:]); err != nil {
			if errors.Is(err, io.ErrUnexpectedEOF) {
				err = io.EOF // half a character at the end: a file cut short
			}
			return 0, err
		}
		w.put(uint16(pair[w.low]) | uint16(pair[w.high])<<8)
	}
	n := copy(p, w.out)
	w.out = w.out[n:]
	return n, nil
}

func (w *wide) put(u uint16) {
	switch {
	case w.first != 0:
		w.out = utf8.AppendRune(w.out[:0], utf16.DecodeRune(rune(w.first), rune(u)))
		w.first = 0
	case u >= 0xd800 && u < 0xdc00:
		w.first = u
	case u != 0xfeff: // the byte order mark itself
		w.out = utf8.AppendRune(w.out[:0], rune(u))
	}
}
