package driver

import (
	"testing"

	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
)

func openPot(t *testing.T, f *drivertest.Pot) *Pot {
	t.Helper()
	conn, d := connect(t, &f.Listener, dialect.RolePot, "nightbench-pot")
	p, _, err := OpenPot(t.Context(), conn, d, PotOptions{Options: options("pot"), Codes: 257})
	must(t, err)
	return p
}

func TestPot(t *testing.T) {
	inBubble(t, "CodesAreReadBack", func(t *testing.T) {
		p := openPot(t, drivertest.NewPot())
		for _, code := range []int{0, 1, 128, 255, 256} { // full scale of an 8-bit part of 257 positions is 0x100 (DS22060B)
			must(t, p.SetCode(t.Context(), code))
			if got, err := p.Code(t.Context()); err != nil || got != code {
				t.Errorf("code %d reads %d, %v", code, got, err)
			}
		}
	})
	inBubble(t, "OutsideItsCodes", func(t *testing.T) {
		f := drivertest.NewPot()
		p := openPot(t, f)
		wants(t, p.SetCode(t.Context(), 257), ErrLimit, "0 to 256")
		wants(t, p.SetCode(t.Context(), -1), ErrLimit)
		if f.Count("WIP 257") > 0 {
			t.Error("it was sent")
		}
	})
	inBubble(t, "StuckWiper", func(t *testing.T) {
		f := drivertest.NewPot()
		f.Stuck = true
		p := openPot(t, f)
		wants(t, p.SetCode(t.Context(), 200), ErrRefused, "pot", "WIP 200", "128")
	})
	inBubble(t, "PartThatDoesNotAnswer", func(t *testing.T) {
		f := drivertest.NewPot()
		p := openPot(t, f)
		f.Deaf = true
		wants(t, p.SetCode(t.Context(), 200), ErrRefused, "-240")
		_, err := p.Code(t.Context())
		wants(t, err, ErrReply, "-1", "reach the part")
	})
	inBubble(t, "PoweredOnAnew", func(t *testing.T) {
		f := drivertest.NewPot()
		p := openPot(t, f)
		must(t, p.SetCode(t.Context(), 200))
		f.PowerOn()
		wants(t, p.SetCode(t.Context(), 201), ErrRestarted, "2 power-ons, 1 before", "middle")
		must(t, p.SetCode(t.Context(), 201)) // said once; it is set again then
		f.PowerOn()
		_, err := p.Code(t.Context())
		wants(t, err, ErrRestarted)
	})
}

func TestOpenPotOfAnotherPart(t *testing.T) {
	inBubble(t, "ErrWrong", func(t *testing.T) {
		f := drivertest.NewPot()
		conn, d := connect(t, &f.Listener, dialect.RolePot, "nightbench-pot")
		_, _, err := OpenPot(t.Context(), conn, d, PotOptions{Options: options("pot"), Codes: 256})
		wants(t, err, ErrWrong, "257 codes", "codes = 256")
	})
}
