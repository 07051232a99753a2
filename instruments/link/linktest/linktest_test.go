package linktest

import (
	"errors"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"nightbench/instruments/link"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

const meterLog = `
# a meter asked twice, the second time slow
> *IDN?\n
< PUMPWORKS,M-6,0,1.0\r\n
> READ?\n
. 2s
< +1.25000000E+00\r\n
! lost
> READ?\n
< \x2b1.5\n
`

func TestPlaybackFollowsTheLog(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l := Open(t, meterLog, link.Options{})
		start := time.Now()
		for _, c := range [][2]string{{"*IDN?", "PUMPWORKS,M-6,0,1.0"}, {"READ?", "+1.25000000E+00"}} {
			if got, err := l.Query(t.Context(), c[0]); err != nil || got != c[1] {
				t.Errorf("%s: %q, %v", c[0], got, err)
			}
		}
		if d := time.Since(start); d != 2*time.Second {
			t.Errorf("took %v, want the 2 s of the log", d)
		}
		synctest.Wait()
		if _, err := l.Query(t.Context(), "READ?"); !errors.Is(err, link.ErrLost) {
			t.Errorf("after the end: %v, want ErrLost", err)
		}
		if err := l.Reopen(t.Context()); err != nil {
			t.Fatal(err)
		}
		if got, err := l.Query(t.Context(), "READ?"); err != nil || got != "+1.5" {
			t.Errorf("after reopening: %q, %v", got, err)
		}
		l.Close()
	})
}
