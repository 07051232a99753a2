package practice

import (
	"context"
	"testing"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
)

// BenchmarkRead is a 1 kHz pump driver whose meter, supply and scope are read as a run
// reads them, without waiting for the wall: simulated seconds a second.
func BenchmarkRead(b *testing.B) {
	clock := &clockwork{}
	bench, err := New(Config{
		Board: pump(), Clock: clock, Seed: 3,
		Meters:   []Meter{{Name: "average", Probe: circuit.Between(circuit.LoadHi, circuit.LoadLo), Unit: si.Volt}},
		Channels: []Channel{{Number: 1, Probe: circuit.Between(circuit.TimerOut, circuit.Common)}},
		Pot:      Pot{Codes: 257, Track: 100e3, Wiper: 75, Start: 128},
	})
	if err != nil {
		b.Fatal(err)
	}
	defer bench.Close()
	say := func(n int, message string) {
		bench.all[n].say([]byte(message))
	}
	say(0, "CURR 1;:VOLT 9;:OUTP ON")
	say(3, "WIP 80") // about 1 kHz
	say(1, "VOLT:RANG 10;NPLC 10")
	say(2, "SENS1:VOLT:RANG:LOW -2;UPP 12;:SENS:SWE:POIN 10000;TIME 20ms")
	clock.Sleep(context.Background(), 5e9)
	from := clock.Elapsed()
	for b.Loop() {
		for range 5 {
			say(1, "READ?")
		}
		say(0, "MEAS:VOLT?")
		say(0, "MEAS:CURR?")
		say(2, "INIT;*OPC?")
		say(2, "TRAC? CH1")
	}
	b.ReportMetric((clock.Elapsed()-from).Seconds()/b.Elapsed().Seconds(), "simulated-s/s")
}
