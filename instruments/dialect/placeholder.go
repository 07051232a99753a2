package dialect

import (
	"errors"
	"strings"
)

// placeholders finds the {…} of a text.
func placeholders(text string) (names []string, err error) {
	for rest := text; ; {
		_, after, ok := strings.Cut(rest, "{")
		if !ok {
			return names, nil
		}
		name, tail, ok := strings.Cut(after, "}")
		if !ok {
			return nil, errors.New("a { without its }")
		}
		names = append(names, name)
		rest = tail
	}
}
