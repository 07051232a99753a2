package scpi

import (
	"fmt"
	"strings"

	"nightbench/instruments"
)

// ParseBool reads a boolean reply by its words, which are in capitals. An
// error is an ErrForm naming the words.
func ParseBool(text string, words map[string]bool) (bool, error) {
	b, ok := words[strings.ToUpper(strings.TrimSpace(text))]
	if !ok {
		return false, fmt.Errorf("%w: %q is none of %v", ErrForm, text, words)
	}
	return b, nil
}

// ParseString takes the quotes off a string reply, "..." or '...'; the quote
// in use is doubled inside.
func ParseString(text string) (string, error) {
	body := strings.TrimSpace(text)
	if len(body) >= 2 && (body[0] == '"' || body[0] == '\'') && body[len(body)-1] == body[0] {
		quote := body[:1]
		inner := body[1 : len(body)-1]
		if !strings.Contains(strings.ReplaceAll(inner, quote+quote, ""), quote) {
			return strings.ReplaceAll(inner, quote+quote, quote), nil
		}
	}
	return "", fmt.Errorf("%w: %q is no string in quotes", ErrForm, text)
}

// FormatString puts text in double quotes.
func FormatString(text string) string {
	return `"` + strings.ReplaceAll(text, `"`, `""`) + `"`
}

// SplitList splits a reply at the commas that are not inside quotes or
// brackets, and trims the parts.
func SplitList(text string) []string {
	var parts []string
	depth, start := 0, 0
	var quote byte
	for i := 0; i < len(text); i++ {
		switch c := text[i]; {
		case quote != 0:
			if c == quote {
				quote = 0
			}
		case c == '"' || c == '\'':
			quote = c
		case c == '(':
			depth++
		case c == ')':
			depth--
		case c == ',' && depth <= 0:
			parts = append(parts, strings.TrimSpace(text[start:i]))
			start = i + 1
		}
	}
	return append(parts, strings.TrimSpace(text[start:]))
}

// ParseIdentity splits a reply to *IDN? into its four fields. The firmware
// field keeps commas of its own. A reply of fewer fields has only Raw.
func ParseIdentity(text string) instruments.Identity {
	f := strings.SplitN(text, ",", 4)
	if len(f) < 4 {
		return instruments.Identity{Raw: text}
	}
	for i := range f {
		f[i] = strings.TrimSpace(f[i])
	}
	return instruments.Identity{Maker: f[0], Model: f[1], Serial: f[2], Firmware: f[3], Raw: text}
}
