package scpi

import (
	"errors"
	"testing"
	"testing/synctest"

	"nightbench/instruments/link"
)

func TestQueryAny(t *testing.T) {
	for _, c := range []struct {
		name, reply, text, block string
		is                       error
	}{
		{"Line", `+1.25E+00\r\n`, "+1.25E+00", "", nil},
		{"OneCharacter", `\n1\n`, "1", "", nil},
		{"Block", `#15a\nb\nc\n`, "", "a\nb\nc", nil},
		{"Hexadecimal", `#HA2F\n`, "#HA2F", "", nil},
		{"Indefinite", `#0abc\n`, "", "", ErrIndefinite},
		{"TooLong", `#3101abc\n`, "", "", ErrFraming},
		{"CutShort", `#`, "", "", link.ErrTimeout},
	} {
		t.Run(c.name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				r, err := play(t, inStep+"> ANY?\\n\n< "+c.reply+"\n", Options{}).QueryAny(t.Context(), "ANY?", 100)
				if r.Text != c.text || string(r.Block) != c.block || !errors.Is(err, c.is) {
					t.Errorf("got %q, %q, %v", r.Text, r.Block, err)
				}
			})
		})
	}
}
