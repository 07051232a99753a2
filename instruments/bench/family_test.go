package bench

import (
	"context"
	"errors"
	"io"
	"slices"
	"strings"
	"testing"

	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/si"
)

// withSupply puts a maker's supply in the place of the practice one.
func withSupply(w *wired, s *drivertest.MakerSupply) Options {
	o := w.options(1)
	others := o.Dial
	o.Dial = func(ctx context.Context, a link.Address) (io.ReadWriteCloser, error) {
		if a.Host == "192.0.2.10:5025" {
			return s.Dial(ctx, a)
		}
		return others(ctx, a)
	}
	return o
}

// ofFamily is the bench file with a supply of a dialect and channel.
func ofFamily(t *testing.T, dialect, channel string) *File {
	return file(t, "practice = true\n", "", "address = \"tcp://192.0.2.10:5025\"\n",
		"address = \"tcp://192.0.2.10:5025\"\ndialect = \""+dialect+"\"\nchannel = "+channel+"\n")
}

func TestSupplyOfAnotherFamily(t *testing.T) {
	inBubble(t, "WhoseRepliesEndInCR", func(t *testing.T) {
		s := drivertest.GPD3303S()
		b, err := Open(t.Context(), ofFamily(t, "gwinstek-gpd", "2"), withSupply(newWired(), s))
		if err != nil {
			t.Fatal(err)
		}
		defer b.Close(context.Background())
		if err := b.Supply.SetVoltage(t.Context(), si.Volts(5)); err != nil {
			t.Fatal(err)
		}
		if got := s.State(2); got.Volts != 5 {
			t.Errorf("channel 2 has %+v", got)
		}
		if got := b.Unproven(); !slices.Equal(got, []string{"output", "voltage", "current_limit"}) {
			t.Errorf("unproven: %v", got)
		}
	})
	inBubble(t, "FoundByIdentity", func(t *testing.T) {
		b, err := Open(t.Context(), ofFamily(t, "auto", "3"), withSupply(newWired(), drivertest.DP832(false)))
		if err != nil {
			t.Fatal(err)
		}
		defer b.Close(context.Background())
		if b.Info[0].Dialect != "rigol-dp800" {
			t.Errorf("found %q", b.Info[0].Dialect)
		}
	})
	inBubble(t, "AChannelItDoesNotHave", func(t *testing.T) {
		_, err := Open(t.Context(), ofFamily(t, "rigol-dp800", "4"), withSupply(newWired(), drivertest.DP832(false)))
		if !errors.Is(err, dialect.ErrCannot) || !strings.Contains(err.Error(), "channels 1 to 3") {
			t.Errorf("got %v", err)
		}
	})
	inBubble(t, "ThatAutoCannotHear", func(t *testing.T) {
		_, err := Open(t.Context(), ofFamily(t, "auto", "1"), withSupply(newWired(), drivertest.GPD3303S()))
		if !errors.Is(err, link.ErrTimeout) || !strings.Contains(err.Error(), "name its dialect") {
			t.Errorf("got %v", err)
		}
	})
	inBubble(t, "TheStandardOneIsProven", func(t *testing.T) {
		b := opened(t, newWired(), file(t), 1)
		if got := b.Unproven(); len(got) != 0 {
			t.Errorf("unproven: %v", got)
		}
	})
}
