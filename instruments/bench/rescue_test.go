package bench

import (
	"context"
	"errors"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
)

// A daemon that finds the bench energised has an address and a dialect, no more.
func TestOpenSupplyMakesSafe(t *testing.T) {
	for name, c := range map[string]struct {
		named  string
		logged string
	}{
		"Named":          {"standard-supply", ""},
		"ByIdentity":     {Auto, ""},
		"OwnFileIsGone":  {filepath.Join("gone", "own.toml"), "going on with standard-supply"},
		"UnknownDialect": {"no-such-dialect", "going on with standard-supply"},
	} {
		inBubble(t, name, func(t *testing.T) {
			w := newWired()
			w.supply.Leave(9, true)
			var said []string
			o := w.options(1)
			o.Log = func(words string) { said = append(said, words) }
			b, err := OpenSupply(t.Context(), "tcp://192.0.2.10:5025", c.named, 1, o)
			if err != nil {
				t.Fatal(err)
			}
			defer b.Close(t.Context())
			r := instruments.MakeSafe(t.Context(), o.Clock, b.Bench, instruments.SafeSpec{})
			if !r.Confirmed || w.supply.On() {
				t.Errorf("%+v", r)
			}
			if all := strings.Join(said, "\n"); !strings.Contains(all, c.logged) || c.logged == "" && all != "" {
				t.Errorf("logged %q", all)
			}
		})
	}
}

func TestOpenSupplySaysNothingFirst(t *testing.T) {
	inBubble(t, "OffIsTheFirstWord", func(t *testing.T) {
		w := newWired()
		w.supply.Leave(9, true)
		b, err := OpenSupply(t.Context(), "tcp://192.0.2.10:5025", "standard-supply", 0, w.options(1))
		if err != nil {
			t.Fatal(err)
		}
		defer b.Close(t.Context())
		if err := b.Supply.Off(t.Context()); err != nil {
			t.Fatal(err)
		}
		time.Sleep(time.Millisecond)
		if got := w.supply.Received(); len(got) == 0 || got[0] != "OUTP OFF" {
			t.Errorf("received %v", got)
		}
	})
}

func TestOpenSupplyOfASilentOne(t *testing.T) {
	inBubble(t, "StillTriesToSwitchItOff", func(t *testing.T) {
		w := newWired()
		w.supply.Fate = func(m string) drivertest.Fate { return drivertest.Fate{Mute: true} }
		w.supply.Leave(9, true)
		o := w.options(1)
		b, err := OpenSupply(t.Context(), "tcp://192.0.2.10:5025", Auto, 1, o)
		if err != nil {
			t.Fatal(err)
		}
		defer b.Close(t.Context())
		ctx, cancel := context.WithTimeout(t.Context(), 20*time.Second)
		defer cancel()
		r := instruments.MakeSafe(ctx, o.Clock, b.Bench, instruments.SafeSpec{})
		if r.Confirmed || w.supply.On() {
			t.Errorf("confirmed by a supply that says nothing: %+v", r)
		}
	})
}

func TestOpenSupplyFails(t *testing.T) {
	inBubble(t, "Missing", func(t *testing.T) {
		w := newWired()
		_, err := OpenSupply(t.Context(), "tcp://192.0.2.99:5025", "standard-supply", 1, w.options(1))
		if !errors.Is(err, link.ErrMissing) || !strings.Contains(err.Error(), "192.0.2.99") {
			t.Errorf("got %v", err)
		}
	})
	if _, err := OpenSupply(t.Context(), "supply one", "standard-supply", 1, Options{}); err == nil {
		t.Error("an address that is none was taken")
	}
}
