package practice

import (
	"encoding/binary"
	"fmt"
	"strconv"
	"strings"
	"testing"
	"time"
)

// field is one number of a list.
func field(t *testing.T, list, sep string, n int) float64 {
	t.Helper()
	parts := strings.Split(list, sep)
	if n >= len(parts) {
		t.Fatalf("%q has no field %d", list, n)
	}
	v, err := strconv.ParseFloat(strings.Trim(parts[n], `" V`), 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// payload takes a block apart: digits of its head, bytes, what follows.
func payload(t *testing.T, reply string) (digits int, data []byte, tail string) {
	t.Helper()
	if len(reply) < 3 || reply[0] != '#' {
		t.Fatalf("no block: %.20q", reply)
	}
	digits = int(reply[1] - '0')
	n, err := strconv.Atoi(reply[2 : 2+digits])
	if err != nil || len(reply) < 2+digits+n {
		t.Fatalf("%.20q, %d bytes: %v", reply, len(reply), err)
	}
	return digits, []byte(reply[2+digits : 2+digits+n]), reply[2+digits+n:]
}

// The formulas of SCPI makers' manuals, written down once more from the reader's side
// (Keysight InfiniiVision, Rigol DS1000Z, Tektronix TDS2000, Siglent SDS1000X-E, R&S
// RTB2000 programming manuals): each form gives the same volts of the same wave.
var readers = map[Form]func(t *testing.T, d *desk, raw func(string) string) (volts []float64, digits int, tail string){
	Standard: func(t *testing.T, d *desk, raw func(string) string) ([]float64, int, string) {
		pre := d.ask("scope", "TRAC:PRE? CH2")
		digits, data, tail := payload(t, raw("TRAC? CH2"))
		return each(len(data)/2, func(i int) float64 {
			return float64(int16(binary.BigEndian.Uint16(data[2*i:])))*field(t, pre, ",", 3) + field(t, pre, ",", 4)
		}), digits, tail
	},
	VoltsOrigin: func(t *testing.T, d *desk, raw func(string) string) ([]float64, int, string) {
		d.tell("scope", "WAV:SOUR CHAN2")
		pre := d.ask("scope", "WAV:PRE?")
		digits, data, tail := payload(t, raw("WAV:DATA?"))
		return each(len(data), func(i int) float64 {
			return (float64(data[i])-field(t, pre, ",", 9))*field(t, pre, ",", 7) + field(t, pre, ",", 8)
		}), digits, tail
	},
	CountsOrigin: func(t *testing.T, d *desk, raw func(string) string) ([]float64, int, string) {
		d.tell("scope", "WAV:SOUR CHAN2")
		pre := d.ask("scope", "WAV:PRE?")
		digits, data, tail := payload(t, raw("WAV:DATA?"))
		return each(len(data), func(i int) float64 {
			return (float64(data[i]) - field(t, pre, ",", 8) - field(t, pre, ",", 9)) * field(t, pre, ",", 7)
		}), digits, tail
	},
	Multiplier: func(t *testing.T, d *desk, raw func(string) string) ([]float64, int, string) {
		d.tell("scope", "DAT:SOU CH2")
		mult, off, zero := d.number("scope", "WFMP:YMU?"), d.number("scope", "WFMP:YOF?"), d.number("scope", "WFMP:YZE?")
		digits, data, tail := payload(t, raw("CURV?"))
		return each(len(data), func(i int) float64 { return (float64(int8(data[i]))-off)*mult + zero }), digits, tail
	},
	Division: func(t *testing.T, d *desk, raw func(string) string) ([]float64, int, string) {
		div := field(t, d.ask("scope", "C2:VDIV?"), " ", 1)
		off := field(t, d.ask("scope", "C2:OFST?"), " ", 1)
		head, block, ok := strings.Cut(raw("C2:WF? DAT2"), ",")
		if !ok || head != "C2:WF DAT2" {
			t.Errorf("head %q", head)
		}
		digits, data, tail := payload(t, block)
		return each(len(data), func(i int) float64 { return float64(int8(data[i]))*div/25 - off }), digits, tail
	},
	Linear: func(t *testing.T, d *desk, raw func(string) string) ([]float64, int, string) {
		inc, origin := d.number("scope", "CHAN2:DATA:YINC?"), d.number("scope", "CHAN2:DATA:YOR?")
		digits, data, tail := payload(t, raw("CHAN2:DATA?"))
		return each(len(data), func(i int) float64 { return origin + inc*float64(data[i]) }), digits, tail
	},
}

func each(n int, f func(i int) float64) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = f(i)
	}
	return out
}

func TestForms(t *testing.T) {
	heads := map[Form]int{VoltsOrigin: 8, CountsOrigin: 9, Division: 9}
	tails := map[Form]string{Division: "\n\n"}
	for _, form := range Forms() {
		for _, bits := range []int{8, 12} {
			t.Run(fmt.Sprintf("%s/%d", form, bits), func(t *testing.T) {
				atDesk(t, steady(), func(d *desk) {
					d.T = t
					d.on("8")
					d.tell("scope", "SENS2:VOLT:RANG:LOW -2;UPP 10;:SENS:SWE:POIN 2000;TIME 4ms;:TRIG:SOUR CH2;LEV 4;:INIT;*OPC?")
					d.hear("scope", time.Second)
					raw := func(query string) string {
						d.tell("scope", query)
						return d.hear("scope", time.Second)
					}
					volts, digits, tail := readers[form](t, d, raw)
					if want := heads[form]; want > 0 && digits != want {
						t.Errorf("the head has %d digits, expected %d", digits, want)
					}
					want := tails[form]
					if want == "" {
						want = "\n"
					}
					if tail != want {
						t.Errorf("the tail is %q, expected %q", tail, want)
					}
					high, low, n := 0.0, 0.0, 0.0
					for _, v := range volts {
						if v > 4 {
							high, n = high+v, n+1
						} else {
							low += v
						}
					}
					high, low = high/n, low/(float64(len(volts))-n)
					d.near("samples", float64(len(volts)), 2000, 0)
					d.near("high level", high, 8, 8*scopeGain+12*scopeOffset+0.05)
					d.near("low level", low, 0, 12*scopeOffset+0.05)
					d.near("share of the time high", n/float64(len(volts)), 0.75, 0.03)
				}, func(c *Config) { c.Scope.Form, c.Scope.Bits = form, bits })
			})
		}
	}
}

func TestTails(t *testing.T) {
	for tail, want := range map[Tail]string{TailNL: "\n", TailNone: "", TailCRNL: "\r\n", TailTwoNL: "\n\n"} {
		atDesk(t, steady(), func(d *desk) {
			d.tell("scope", "SENS:SWE:POIN 10;TIME 1ms;:INIT;*OPC?")
			d.hear("scope", time.Second)
			d.tell("scope", "TRAC? CH1")
			if _, _, got := payload(t, d.hear("scope", time.Second)); got != want {
				t.Errorf("%s: %q, expected %q", tail, got, want)
			}
			if got := d.ask("scope", "*OPC?"); got != "1" {
				t.Errorf("%s: a plain reply is %q", tail, got)
			}
		}, func(c *Config) { c.Scope.Tail = tail })
	}
}
