package scpi

import (
	"errors"
	"strings"
	"testing"
	"testing/synctest"
	"time"
)

// A family whose replies carry the query's header until it is told not to is
// the same instrument before and after (Siglent SDS1104X-E Programming Guide p. 84).
func TestHeadersInAProof(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, "> *IDN?\\n\n< *IDN "+self+"\\n\n> *OPC?\\n\n< *OPC 1\\n\n> CHDR OFF\\n\n> *IDN?\\n\n< "+self+"\\n\n> *OPC?\\n\n< 1\\n\n> *OPC?\\n\n< 1\\n\n", Options{})
		if err := c.Write(t.Context(), "CHDR OFF"); err != nil {
			t.Fatal(err)
		}
		c.doubt()
		c.unsure = 1
		if err := c.Resync(t.Context()); err != nil || !c.InStep() {
			t.Errorf("in step %v, %v", c.InStep(), err)
		}
	})
}

func TestTailOfABlock(t *testing.T) {
	for _, c := range []struct{ name, reply, tail, says string }{
		{"TwoNL", `#12ab\n\n`, "\n\n", ""},
		{"OneOfTwo", `#12ab\n`, "\n\n", "came after the 2 bytes"},
		{"None", `#12ab`, "\n", "came after the 2 bytes"},
		{"Another", `#12ab\r\n`, "\n", "came after the 2 bytes"},
	} {
		t.Run(c.name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				conn := play(t, inStep+"> CURV?\\n\n< "+c.reply+"\n", Options{})
				got, err := conn.QueryBlockAs(t.Context(), "CURV?", BlockForm{Tail: c.tail}, 100)
				if c.says == "" && (err != nil || string(got) != "ab") {
					t.Errorf("got %q, %v", got, err)
				}
				if c.says != "" && (!errors.Is(err, ErrFraming) || got != nil || !strings.Contains(err.Error(), c.says)) {
					t.Errorf("got %q, %v, want an error with %q", got, err, c.says)
				}
			})
		})
	}
}

func TestOneOfSeveralLeads(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, inStep+"> C1:WF? DAT2\\n\n< DAT2,#12ab\\n\\n\n> C1:WF? DAT2\\n\n< C1:WF DAT2,#12cd\\n\\n\n", Options{})
		form := BlockForm{Leads: []string{"DAT2,", "C1:WF DAT2,"}}
		for _, want := range []string{"ab", "cd"} {
			if got, err := c.QueryBlockAs(t.Context(), "C1:WF? DAT2", form, 100); err != nil || string(got) != want {
				t.Errorf("got %q, %v", got, err)
			}
		}
	})
}

// After a command that takes an instrument time it is left alone, whoever speaks next.
func TestRestAfterACommand(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, inStep+"> *RST\\n\n> VOLT?\\n\n< 5\\n\n> VOLT?\\n\n< 5\\n\n", Options{Gap: 10 * time.Millisecond})
		if err := c.Resting(time.Second).Write(t.Context(), "*RST"); err != nil {
			t.Fatal(err)
		}
		for _, least := range []time.Duration{time.Second, 10 * time.Millisecond} {
			begun := time.Now()
			if _, err := c.Query(t.Context(), "VOLT?"); err != nil {
				t.Fatal(err)
			}
			if took := time.Since(begun); took < least || took > least+500*time.Millisecond {
				t.Errorf("asked after %v, want %v", took, least)
			}
		}
	})
}
