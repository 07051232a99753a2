package link

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func TestParse(t *testing.T) {
	for _, c := range []struct {
		text string
		want Address
	}{
		{"tcp://192.0.2.10:5025", Address{Scheme: "tcp", Host: "192.0.2.10:5025"}},
		{"tcp://[::1]:5555", Address{Scheme: "tcp", Host: "[::1]:5555"}},
		{"serial:///dev/ttyUSB0", Address{Scheme: "serial", Path: "/dev/ttyUSB0", Line: DefaultLine}},
		{"serial:///dev/ttyS0?baud=115200&bits=7&parity=even&stop=2&flow=rtscts",
			Address{Scheme: "serial", Path: "/dev/ttyS0", Line: Line{115200, 7, "even", "2", "rtscts"}}},
		{"serial:///dev/ttyS0?parity=mark&flow=dtrdsr", Address{Scheme: "serial", Path: "/dev/ttyS0", Line: Line{9600, 8, "mark", "1", "dtrdsr"}}},
		{"usbtmc:///dev/usbtmc0", Address{Scheme: "usbtmc", Path: "/dev/usbtmc0"}},
		{"usbtmc://0957-179A/MY5123", Address{Scheme: "usbtmc", USB: USB{"0957", "179a", "MY5123"}}},
		{"usbtmc://0957-1796", Address{Scheme: "usbtmc", USB: USB{"0957", "1796", ""}}},
		{"hislip://192.0.2.12", Address{Scheme: "hislip", Host: "192.0.2.12:4880", Path: "hislip0"}},
		{"hislip://[2001:db8::7]:4881/inst1", Address{Scheme: "hislip", Host: "[2001:db8::7]:4881", Path: "inst1"}},
	} {
		got, err := Parse(c.text)
		c.want.text = c.text
		if err != nil || got != c.want {
			t.Errorf("Parse(%q) = %+v, %v; want %+v", c.text, got, err, c.want)
		}
		if got.String() != c.text {
			t.Errorf("String() = %q, want %q", got, c.text)
		}
	}
}

func TestParseRefuses(t *testing.T) {
	for text, says := range map[string]string{
		"vxi11://192.0.2.10":                      "not supported yet; use serial:///dev/",
		"usbtmc://usbtmc0":                        "after three slashes",
		"usbtmc:///dev/usbtmc0?baud=9600":         "no line settings",
		"hislip:///inst0":                         "use hislip://host",
		"hislip://192.0.2.10:0":                   "1 to 65535",
		"hislip://192.0.2.10/a/b":                 "use one name",
		"gpib://0/5":                              "not supported yet",
		"COM3":                                    "use serial:///dev/",
		"serial://ttyUSB0":                        "three slashes",
		"serial:///":                              "three slashes",
		"serial:///dev/ttyUSB0?speed=9600":        "use baud, bits, parity, stop, flow",
		"serial:///dev/ttyUSB0?baud=fast":         "whole number of bit/s",
		"serial:///dev/ttyUSB0?bits=9":            "5, 6, 7 or 8",
		"serial:///dev/ttyUSB0?parity=weird":      "none, odd, even",
		"serial:///dev/ttyUSB0?flow=cts":          "none, rtscts, xonxoff",
		"serial:///dev/ttyUSB0?baud=300&baud=600": "given 2 times",
		"tcp://192.0.2.10":                        "needs a host and a port",
		"tcp://:5025":                             "needs a host and a port",
		"tcp://192.0.2.10:70000":                  "1 to 65535",
		"tcp://192.0.2.10:5025/inst0":             "nothing may follow",
	} {
		if _, err := Parse(text); err == nil || !strings.Contains(err.Error(), says) {
			t.Errorf("Parse(%q): %v; want it to say %q", text, err, says)
		}
	}
	if _, err := Parse("gpib://0/5"); !errors.Is(err, ErrUnsupported) {
		t.Errorf("gpib: %v, want ErrUnsupported", err)
	}
}

func TestCanonical(t *testing.T) {
	dir, err := filepath.EvalSymlinks(t.TempDir())
	if err != nil {
		t.Fatal(err)
	}
	device, byID := filepath.Join(dir, "ttyUSB0"), filepath.Join(dir, "usb-XYZ")
	if err := errors.Join(os.WriteFile(device, nil, 0o600), os.Symlink(device, byID)); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		a, b string
		same bool
	}{
		{"serial://" + device, "serial://" + byID + "?baud=115200", true},
		{"serial://" + device, "serial://" + device + "1", false},
		{"tcp://Meter.local:5025", "tcp://meter.local.:05025", true},
		{"tcp://192.0.2.1:5025", "tcp://192.0.2.1:5026", false},
		{"hislip://Scope.local", "hislip://scope.local:4880/hislip0", true},
		{"hislip://192.0.2.1", "hislip://192.0.2.1/hislip1", false},
		{"usbtmc://dead-beef/1", "usbtmc://DEAD-beef/1", true},
		{"usbtmc:///dev/usbtmc97", "usbtmc:///dev/../dev/usbtmc97", true},
		{"tcp://[::ffff:192.0.2.1]:5025", "tcp://192.0.2.1:5025", true},
	} {
		a, errA := Parse(c.a)
		b, errB := Parse(c.b)
		if errA != nil || errB != nil {
			t.Fatal(errA, errB)
		}
		if same := a.Canonical() == b.Canonical(); same != c.same {
			t.Errorf("%s and %s: same port %v, want %v (%s, %s)", c.a, c.b, same, c.same, a.Canonical(), b.Canonical())
		}
	}
}
