package practice

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
)

const idn = "Nightbench,practice-meter,DM-average,1.0\n"

// Each fault of replies, as a person at the line sees it.
func TestFaultsOnTheWire(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		for _, c := range []struct {
			fault Fault
			want  string // all that comes in 3 s; "~" stands for eight bytes of noise
		}{
			{Fault{Kind: Silence}, ""},
			{Fault{Kind: Late, Size: 4}, ""},
			{Fault{Kind: Twice}, idn + idn},
			{Fault{Kind: Truncated}, idn[:len(idn)/2]},
			{Fault{Kind: Garbage}, idn[:len(idn)/2] + "~" + idn[len(idn)/2:]},
			{Fault{Kind: StrayCR}, "\r" + strings.TrimSuffix(idn, "\n") + "\r\n"},
			{Fault{Kind: StrayLF}, idn + "\n"},
			{Fault{Kind: Echo}, "*IDN?\n" + idn},
			{Fault{Kind: Intruder, Says: "SYST:ERR?"}, "0,\"No error\"\n" + idn},
		} {
			f := c.fault
			f.On, f.Times = "average", 1
			d.bring(f)
			d.tell("average", "*IDN?")
			got := d.hear("average", 3*time.Second)
			if before, _, ok := strings.Cut(c.want, "~"); ok && len(got) == len(c.want)+7 {
				noise := got[len(before) : len(before)+8]
				if slices.ContainsFunc([]byte(noise), func(b byte) bool { return b < 0x80 }) {
					t.Errorf("%s: the noise %q has plain letters", f.Kind, noise)
				}
				got = got[:len(before)] + "~" + got[len(before)+8:]
			}
			if got != c.want {
				t.Errorf("%s: %q came, expected %q", f.Kind, got, c.want)
			}
			rest := d.hear("average", 3*time.Second)
			if want := map[Kind]string{Late: idn}[f.Kind]; rest != want {
				t.Errorf("%s: later came %q, expected %q", f.Kind, rest, want)
			}
			if got := d.ask("average", "*IDN?") + "\n"; got != idn {
				t.Errorf("after %s, which was to spoil one reply: %q", f.Kind, got)
			}
		}
		if left := d.Faults(); len(left) != 0 {
			t.Errorf("still in force: %+v", left)
		}
	})
}

func TestWrongCountTouchesBlocksOnly(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		d.bring(Fault{Kind: WrongCount, On: "scope", Times: 1})
		d.tell("scope", "SENS:SWE:POIN 10;TIME 1ms;:INIT")
		if got := d.ask("scope", "*OPC?"); got != "1" {
			t.Errorf("a plain reply: %q", got)
		}
		d.tell("scope", "TRAC? CH1")
		if got := d.hear("scope", time.Second); !strings.HasPrefix(got, "#3120") || len(got) != len("#3120")+20+1 {
			t.Errorf("a block of 20 bytes that announces 100 more: %d bytes, %.8q", len(got), got)
		}
		d.tell("scope", "TRAC? CH1")
		if got := d.hear("scope", time.Second); !strings.HasPrefix(got, "#220") {
			t.Errorf("the next block: %.8q", got)
		}
	})
}

func TestFaultsOfInstruments(t *testing.T) {
	t.Run("QueueFull", func(t *testing.T) {
		atDesk(t, steady(), func(d *desk) {
			d.bring(Fault{Kind: QueueFull, On: "supply"})
			var last string
			count := 0
			for e := d.ask("supply", "SYST:ERR?"); !strings.HasPrefix(e, "0,"); e = d.ask("supply", "SYST:ERR?") {
				last = e
				count++
			}
			if count != 20 || last != `-350,"Queue overflow"` {
				t.Errorf("%d errors, the last %s", count, last)
			}
		})
	})
	t.Run("Tripped", func(t *testing.T) {
		for _, staysOff := range []bool{false, true} {
			atDesk(t, steady(), func(d *desk) {
				d.on("8")
				d.bring(Fault{Kind: Tripped})
				if got := d.ask("supply", "OUTP?;:VOLT:PROT:TRIP?"); got != "0;1" {
					t.Errorf("tripped: OUTP?;TRIP? %s", got)
				}
				d.tell("supply", "OUTP ON")
				if e := d.ask("supply", "SYST:ERR?"); !strings.HasPrefix(e, "-221,") {
					t.Errorf("OUTP ON while tripped: %s", e)
				}
				want := map[bool]string{false: "1;0", true: "0;0"}[staysOff]
				d.tell("supply", "VOLT:PROT:CLE")
				if got := d.ask("supply", "OUTP?;:VOLT:PROT:TRIP?"); got != want {
					t.Errorf("cleared, staysOff %v: OUTP?;TRIP? %s, expected %s", staysOff, got, want)
				}
			}, func(c *Config) { c.Supply.StaysOff = staysOff })
		}
	})
	t.Run("StuckWiper", func(t *testing.T) {
		atDesk(t, timed(), func(d *desk) {
			d.on("9")
			period := func() float64 { return 1 / d.frequency() }
			d.tell("pot", "WIP 20")
			before := period()
			d.bring(Fault{Kind: StuckWiper})
			d.tell("pot", "WIP 200")
			if code := d.ask("pot", "WIP?"); code != "200" {
				t.Errorf("the register reads %s", code)
			}
			d.near("period with a stuck wiper", period(), before, before*1e-3)
			d.Lift(StuckWiper, "")
			d.tell("pot", "WIP 200")
			if after := period(); after < 3*before {
				t.Errorf("period %g s at code 20, %g s at code 200 once it moves", before, after)
			}
		})
	})
	t.Run("LeadOff", func(t *testing.T) {
		atDesk(t, steady(), func(d *desk) {
			d.on("8")
			d.tell("average", "VOLT:RANG 10")
			d.near("before", d.number("average", "READ?"), 2, 10e-3)
			d.bring(Fault{Kind: LeadOff, On: "average"})
			if v := d.number("average", "READ?"); v > 0.01 || v < -0.01 || v == 0 {
				t.Errorf("a lead in the air reads %g V; pick-up of about 1 mV was expected", v)
			}
			d.Lift(LeadOff, "average")
			d.near("after", d.number("average", "READ?"), 2, 10e-3)
			d.bring(Fault{Kind: LeadOff, On: "motor"}) // its leads carry the load's current
			d.near("average with the load interrupted", d.number("average", "READ?"), 2, 10e-3)
			d.near("load current", d.number("motor", "READ?"), 0, 1e-3)
		})
	})
	t.Run("ProbeTen", func(t *testing.T) {
		atDesk(t, steady(), func(d *desk) {
			d.on("8")
			d.tell("scope", "INP2:ATT 10;:SENS2:VOLT:RANG:LOW -20;UPP 20;:INIT")
			d.near("before", d.number("scope", "MEAS:VMAX? CH2"), 8, 1)
			d.bring(Fault{Kind: ProbeTen})
			d.tell("scope", "SENS2:VOLT:RANG:LOW -100;UPP 100;:INIT")
			d.near("with the slide at ×1 and the scope told ×10", d.number("scope", "MEAS:VMAX? CH2"), 80, 6)
		}, func(c *Config) { c.Channels[1].Factor = 10 })
	})
}

// frequency is what the scope's own counter says of the timer's output, Hz.
func (d *desk) frequency() float64 {
	d.Helper()
	d.tell("scope", "SENS1:VOLT:RANG:LOW -2;UPP 12;:SENS:SWE:POIN 20000;TIME 20ms;:INIT")
	return d.number("scope", "MEAS:FREQ? CH1")
}

func TestFaultsOfTheBoard(t *testing.T) {
	t.Run("Short", func(t *testing.T) {
		atDesk(t, steady(), func(d *desk) {
			d.on("8")
			d.bring(Fault{Kind: Short, Size: 0.5, For: 5})
			time.Sleep(time.Second)
			d.near("voltage of 1 A in 0.5 Ω", d.number("supply", "MEAS:VOLT?"), 0.5, 0.02)
			if q := d.ask("supply", "STAT:QUES:COND?"); q != "1" {
				t.Errorf("constant current was expected, the register says %s", q)
			}
			time.Sleep(5 * time.Second)
			d.near("voltage when it lifted itself", d.number("supply", "MEAS:VOLT?"), 8, 0.02)
		})
	})
	t.Run("Open", func(t *testing.T) {
		atDesk(t, steady(), func(d *desk) {
			d.on("8")
			d.bring(Fault{Kind: Open})
			d.near("load current", d.number("motor", "READ?"), 0, 1e-3)
			d.Lift(Open, "")
			d.near("load current again", d.number("motor", "READ?"), 0.02, 1e-3)
		})
	})
	t.Run("RotorLocked", func(t *testing.T) {
		atDesk(t, pump(), func(d *desk) {
			d.tell("pot", "WIP 10")
			d.on("9")
			time.Sleep(5 * time.Second)
			running := d.number("motor", "READ?")
			d.bring(Fault{Kind: RotorLocked})
			time.Sleep(time.Second)
			if locked := d.number("motor", "READ?"); locked < 2*running {
				t.Errorf("%.3g A running, %.3g A locked", running, locked)
			}
		})
	})
	t.Run("Drift", func(t *testing.T) {
		atDesk(t, timed(), func(d *desk) {
			d.on("9")
			before := d.frequency()
			d.bring(Fault{Kind: Drift, Size: 0.04})
			time.Sleep(30 * time.Minute)
			d.near("frequency after half an hour at 4 % an hour of capacitance", d.frequency()/before, 1/1.02, 1e-3)
		})
	})
	t.Run("PowerDip", func(t *testing.T) {
		for _, resumes := range []bool{false, true} {
			atDesk(t, steady(), func(d *desk) {
				d.on("8")
				d.tell("pot", "WIP 3")
				d.ask("supply", "*ESR?")
				d.bring(Fault{Kind: PowerDip, For: 2})
				time.Sleep(time.Second)
				d.tell("supply", "*IDN?")
				if got := d.hear("supply", 100*time.Millisecond); got != "" {
					t.Errorf("without mains it says %q", got)
				}
				time.Sleep(2 * time.Second)
				want := map[bool]string{false: "0;0", true: "1;8"}[resumes]
				if got := fmt.Sprintf("%s;%.3g", d.ask("supply", "OUTP?"), d.number("supply", "VOLT?")); got != want {
					t.Errorf("after the dip, resumes %v: %s, expected %s", resumes, got, want)
				}
				if esr := d.ask("supply", "*ESR?"); esr != "128" {
					t.Errorf("the power-on bit: *ESR? %s", esr)
				}
				if got := d.ask("pot", "WIP?") + " " + d.ask("pot", "WIP:POW?"); got != "128 2" {
					t.Errorf("pot: code and power-ons %s", got)
				}
			}, func(c *Config) { c.Supply.Resumes = resumes })
		}
	})
}

// An instrument that is unplugged is gone for those who hold its port; plugged in again
// it answers under the name that stays, which leads to another device.
func TestUnplugAndPlugInAgain(t *testing.T) {
	b, err := New(Config{Board: steady(), Clock: instruments.NewClock(1), Pot: Pot{Codes: 257, Track: 100e3}})
	if err != nil {
		t.Fatal(err)
	}
	defer b.Close()
	name := filepath.Join(t.TempDir(), "pot")
	if _, err := b.Instruments()[1].ServePTYAs(name); err != nil {
		t.Fatal(err)
	}
	before, err := os.Readlink(name)
	if err != nil {
		t.Fatal(err)
	}
	if got := conversation(t, name, "*OPC?\n"); got != "1\n" {
		t.Errorf("before: %q", got)
	}
	held, err := os.OpenFile(name, os.O_RDWR, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer held.Close()
	if err := b.Inject(Fault{Kind: Unplugged, On: "pot"}); err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(name); err == nil {
		t.Error("an unplugged device has a name")
	}
	if n, err := held.Read(make([]byte, 1)); err == nil && n > 0 {
		t.Error("who held the port still hears something")
	}
	if !b.Lift(Unplugged, "pot") {
		t.Fatal("nothing to lift")
	}
	after, err := os.Readlink(name)
	if err != nil || after == before {
		t.Errorf("plugged in again as %s, before %s, %v", after, before, err)
	}
	if got := conversation(t, name, "*OPC?\n"); got != "1\n" {
		t.Errorf("after: %q", got)
	}
}

// conversation writes to a device and reads until a line is there.
func conversation(t *testing.T, path, message string) string {
	t.Helper()
	f, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if _, err := f.WriteString(message); err != nil {
		t.Fatal(err)
	}
	buf := make([]byte, 100)
	n, err := f.Read(buf)
	if err != nil {
		t.Fatal(err)
	}
	return string(buf[:n])
}

func TestFaultsThatMakeNoSense(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		for _, c := range []struct {
			fault Fault
			words string
		}{
			{Fault{Kind: "gremlin"}, "there are silence,"},
			{Fault{Kind: Silence}, "say on which instrument: one of supply, average, motor, scope, pot"},
			{Fault{Kind: Silence, On: "lamp"}, "one of supply"},
			{Fault{Kind: StuckWiper, On: "scope"}, "one of pot"},
			{Fault{Kind: Silence, On: "pot", Size: 2}, "has no size"},
			{Fault{Kind: Short, Size: -1}, "below 0"},
			{Fault{Kind: RotorLocked, On: "pot"}, "leave out"},
			{Fault{Kind: Tripped, For: 3}, "is not lifted"},
			{Fault{Kind: Short, Times: 3}, "only faults of replies"},
			{Fault{Kind: Drift, On: "sun"}, "there are capacitor, charge"},
			{Fault{Kind: Unplugged, On: "pot"}, "no port of the practice bench's own"},
			{Fault{Kind: Open, On: "flyback"}, "no flyback"},
			{Fault{Kind: Late, On: "pot", Says: "boo"}, "says nothing"},
		} {
			if err := d.Inject(c.fault); err == nil || !strings.Contains(err.Error(), c.words) {
				t.Errorf("%+v: %v, expected %q", c.fault, err, c.words)
			}
		}
		d.bring(Fault{Kind: Silence, On: "pot"})
		if err := d.Inject(Fault{Kind: Silence, On: "pot"}); err == nil {
			t.Error("the same fault twice")
		}
		if d.Lift(Echo, "") {
			t.Error("lifted what was not there")
		}
	})
}

func TestScheduledFault(t *testing.T) {
	atDesk(t, steady(), func(d *desk) {
		if err := d.Schedule(10*time.Second, Fault{Kind: Short, For: 5}, nil); err != nil {
			t.Fatal(err)
		}
		if err := d.Schedule(0, Fault{Kind: Silence}, nil); err == nil {
			t.Error("a fault on no instrument can be scheduled")
		}
		var seen []int
		for range 4 {
			seen = append(seen, len(d.Faults()))
			time.Sleep(4 * time.Second)
		}
		if fmt.Sprint(seen) != "[0 0 0 1]" || len(d.Faults()) != 0 {
			t.Errorf("faults in force every 4 s: %v, then %d", seen, len(d.Faults()))
		}
	})
}
