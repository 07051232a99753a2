//go:build torture

package practice

import (
	"bufio"
	"net"
	"runtime"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
)

// TestTortureNight is a night of ten hours at pace 600 on real sockets: the pump driver
// read as a run reads it, clients that come and go, faults now and then. Memory and
// goroutines at its end are those after its first tenth.
func TestTortureNight(t *testing.T) {
	const pace, night = 600.0, 10 * time.Hour
	b := pump()
	b.Load.Cogging, b.Load.CoggingPerTurn, b.Load.Ripple, b.Load.RipplePerTurn = 0.13e-3, 6, 0.005, 6
	bench, err := New(Config{
		Board: b, Clock: instruments.NewClock(pace), Seed: 3, Probe: true, Cutoff: true,
		Climate:  Climate{Room: 296, Swing: -2, Rise: 5, CapacitorPerKelvin: -200e-6},
		Meters:   []Meter{{Name: "average", Probe: circuit.Between(circuit.LoadHi, circuit.LoadLo), Unit: si.Volt}},
		Channels: []Channel{{Number: 1, Probe: circuit.Between(circuit.TimerOut, circuit.Common)}},
		Pot:      Pot{Codes: 257, Track: 100e3, Wiper: 75, Start: 128},
	})
	if err != nil {
		t.Fatal(err)
	}
	defer bench.Close()
	addresses := map[string]string{}
	for _, i := range bench.Instruments() {
		a, err := i.ServeTCP(t.Context(), "127.0.0.1:0")
		if err != nil {
			t.Fatal(err)
		}
		addresses[i.Name] = a[len("tcp://"):]
	}
	say := func(name string, messages ...string) {
		c, err := net.Dial("tcp", addresses[name])
		if err != nil {
			t.Fatal(err)
		}
		defer c.Close()
		c.SetDeadline(time.Now().Add(2 * time.Minute))
		r := bufio.NewReader(c)
		for _, m := range messages {
			if _, err := c.Write([]byte(m + ";*OPC?\n")); err != nil {
				t.Fatal(err)
			}
			if _, err := r.ReadString('\n'); err != nil {
				t.Fatalf("%s: %s: %v", name, m, err)
			}
		}
	}
	var first struct {
		heap       uint64
		goroutines int
	}
	measure := func() (uint64, int) {
		runtime.GC()
		runtime.GC()
		var m runtime.MemStats
		runtime.ReadMemStats(&m)
		return m.HeapAlloc, runtime.NumGoroutine()
	}
	say("supply", "CURR 1;:VOLT 9;:OUTP ON")
	say("average", "VOLT:RANG 10;NPLC 10")
	rounds := 0
	for bench.world.clock.Elapsed() < night {
		say("cutoff", "FEED")
		say("pot", "WIP "+[]string{"3", "20", "60", "200"}[rounds%4])
		say("average", "READ?", "READ?")
		say("supply", "MEAS:VOLT?", "MEAS:CURR?")
		say("scope", "SENS1:VOLT:RANG:LOW -2;UPP 12;:SENS:SWE:POIN 2000;TIME 10ms;:INIT")
		say("probe", "TEMP?")
		if rounds%20 == 7 {
			if err := bench.Inject(Fault{Kind: StrayLF, On: "pot", Times: 1}); err != nil {
				t.Fatal(err)
			}
		}
		rounds++
		if first.heap == 0 && bench.world.clock.Elapsed() > night/10 {
			first.heap, first.goroutines = measure()
		}
	}
	heap, goroutines := measure()
	t.Logf("%d rounds in a night of %s at pace %g: heap %.1f MB after a tenth, %.1f MB at the end; goroutines %d and %d", rounds, night, pace,
		float64(first.heap)/1e6, float64(heap)/1e6, first.goroutines, goroutines)
	if heap > first.heap+first.heap/5+1<<20 {
		t.Errorf("the heap grew from %d to %d bytes", first.heap, heap)
	}
	if goroutines > first.goroutines+4 {
		t.Errorf("goroutines grew from %d to %d", first.goroutines, goroutines)
	}
}
