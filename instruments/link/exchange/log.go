// Package exchange records what passes a link as a readable exchange log, and
// plays such a log back as an instrument.
//
// A log is text, one step a line:
//
//	# a comment; empty lines are skipped too
//	> *IDN?\n
//	< PUMPWORKS,PS-1,0,1.0\r\n
//	. 250ms
//	! lost
//
// ">" is what the program sends and "<" what the instrument says, with \r,
// \n, \t, \\ and \xNN for what cannot be printed, and \x20 for a space at the
// end of a line; "." is a silence of the instrument; "! lost" hangs up.
package exchange

import (
	"bufio"
	"fmt"
	"io"
	"strconv"
	"strings"
	"time"
)

// Step is one line of a log.
type Step struct {
	Kind  byte // '>', '<', '.' or '!'
	Data  []byte
	Pause time.Duration
	Line  int // in the log, from 1
}

// Parse reads a log.
func Parse(r io.Reader) (steps []Step, err error) {
	in := bufio.NewScanner(r)
	in.Buffer(nil, 16<<20)
	for n := 1; in.Scan(); n++ {
		text := strings.TrimSpace(in.Text())
		if text == "" || text[0] == '#' {
			continue
		}
		s, err := parseStep(text)
		if err != nil {
			return nil, fmt.Errorf("exchange log line %d: %w", n, err)
		}
		s.Line = n
		steps = append(steps, s)
	}
	return steps, in.Err()
}

func parseStep(text string) (s Step, err error) {
	s.Kind = text[0]
	rest, spaced := strings.CutPrefix(text[1:], " ")
	switch {
	case text == "! lost":
	case !spaced:
		err = fmt.Errorf("%q: a mark and one space must come first", text)
	case s.Kind == '>', s.Kind == '<':
		s.Data, err = unescape(rest)
	case s.Kind == '.':
		s.Pause, err = time.ParseDuration(rest)
	default:
		err = fmt.Errorf("unknown mark %q; use >, <, . or ! lost", text[:1])
	}
	return s, err
}

// escape spells bytes as a log does.
func escape(data []byte) string {
	var b strings.Builder
	for i, c := range data {
		switch {
		case c == '\n':
			b.WriteString(`\n`)
		case c == '\r':
			b.WriteString(`\r`)
		case c == '\t':
			b.WriteString(`\t`)
		case c == '\\':
			b.WriteString(`\\`)
		case c < ' ' || c > '~' || c == ' ' && i == len(data)-1:
			fmt.Fprintf(&b, `\x%02x`, c)
		default:
			b.WriteByte(c)
		}
	}
	return b.String()
}

// unescape is the inverse of escape.
func unescape(text string) ([]byte, error) {
	out := []byte{}
	for i := 0; i < len(text); i++ {
		if text[i] != '\\' {
			out = append(out, text[i])
			continue
		}
		i++
		if i == len(text) {
			return nil, fmt.Errorf("a lone \\ at the end")
		}
		plain := strings.IndexByte(`nrt\`, text[i])
		switch {
		case plain >= 0:
			out = append(out, "\n\r\t\\"[plain])
		case text[i] == 'x' && i+2 < len(text):
			v, err := strconv.ParseUint(text[i+1:i+3], 16, 8)
			if err != nil {
				return nil, fmt.Errorf(`\x%s: two hexadecimal digits must follow`, text[i+1:i+3])
			}
			out = append(out, byte(v))
			i += 2
		default:
			return nil, fmt.Errorf(`unknown escape \%c; use \n, \r, \t, \\ or \xNN`, text[i])
		}
	}
	return out, nil
}
