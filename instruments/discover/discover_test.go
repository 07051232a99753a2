package discover

import (
	"context"
	"errors"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"testing/synctest"

	"go.uber.org/goleak"

	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// computer is a folder that stands in for one with a USB serial adapter and a USB scope.
func computer(t *testing.T) string {
	t.Helper()
	root := t.TempDir()
	const usb = "sys/devices/usb1/"
	for name, content := range map[string]string{
		usb + "1-1/idVendor": "0403", usb + "1-1/idProduct": "6001", usb + "1-1/serial": "A5 0/285", usb + "1-1/manufacturer": "Cableworks", usb + "1-1/product": "Serial cable",
		usb + "1-1/1-1:1.0/ttyUSB0/port_number": "0", usb + "1-2/idVendor": "0957", usb + "1-2/idProduct": "1796", usb + "1-2/serial": "MY1", usb + "1-2/1-2:1.0/x": "",
		"sys/devices/pnp0/x": "", "dev/ttyUSB0": "", "dev/usbtmc0": "", "dev/ttyS0": "",
	} {
		path := filepath.Join(root, name)
		if err := errors.Join(os.MkdirAll(filepath.Dir(path), 0o755), os.WriteFile(path, []byte(content+"\n"), 0o666)); err != nil {
			t.Fatal(err)
		}
	}
	for name, to := range map[string]string{
		"sys/class/tty/ttyUSB0/device": usb + "1-1/1-1:1.0/ttyUSB0", "sys/class/usbmisc/usbtmc0/device": usb + "1-2/1-2:1.0", "sys/class/tty/ttyS0/device": "sys/devices/pnp0",
		"dev/serial/by-id/usb-Cableworks-if00": "dev/ttyUSB0",
	} {
		path := filepath.Join(root, name)
		if err := errors.Join(os.MkdirAll(filepath.Dir(path), 0o755), os.Symlink(filepath.Join(root, to), path)); err != nil {
			t.Fatal(err)
		}
	}
	return root
}

func TestPluggedAndRules(t *testing.T) {
	found, err := Plugged(computer(t))
	if err != nil || len(found) != 3 {
		t.Fatalf("%+v, %v", found, err)
	}
	for n, want := range []struct{ address, words, rule string }{
		{"serial:///dev/ttyS0", "serial port of the computer (now /dev/ttyS0)", ""},
		{"serial:///dev/serial/by-id/usb-Cableworks-if00", "Cableworks Serial cable (now /dev/ttyUSB0)",
			`SUBSYSTEM=="tty", ATTRS{idVendor}=="0403", ATTRS{idProduct}=="6001", ATTRS{serial}=="A5 0/285", GROUP="dialout", MODE="0660", TAG+="uaccess", SYMLINK+="nightbench/0403-6001-A5_0_285"`},
		{"usbtmc://0957-1796/MY1", "USB device 0957-1796/MY1 (now /dev/usbtmc0); this program's USB link was never tried on a device: watch it at first",
			`SUBSYSTEM=="usbmisc", ATTRS{idVendor}=="0957", ATTRS{idProduct}=="1796", ATTRS{serial}=="MY1", GROUP="dialout", MODE="0660", TAG+="uaccess", SYMLINK+="nightbench/0957-1796-MY1"`},
	} {
		f := found[n]
		if f.Address != want.address || f.Words != want.words || !strings.Contains(Rule(f), want.rule) || want.rule == "" && Rule(f) != "" {
			t.Errorf("%+v\nrule %s", f, Rule(f))
		}
	}
}

// heard is what the meter was sent.
func TestAskSendsNothingButTheIdentityQuery(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		meter := drivertest.NewMeter()
		f := Found{Address: "tcp://192.0.2.11:5025"}
		Ask(t.Context(), &f, meter.Dial)
		if f.Trouble != "" || f.Dialect != "standard-meter" || f.Role != "meter" || f.Identity.Serial != "T2" {
			t.Errorf("%+v", f)
		}
		if want := []string{"[[meter]]", `address = "tcp://192.0.2.11:5025"`, `dialect = "standard-meter"`, `serial = "T2"`}; !slices.Equal(f.Lines, want) {
			t.Errorf("lines %q", f.Lines)
		}
		if got := meter.Received(); !slices.Equal(got, []string{"*IDN?", "*IDN?"}) {
			t.Errorf("it was sent %q", got)
		}
	})
}

func TestAskOfStrangers(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		stranger := drivertest.NewMeter()
		stranger.Device.Identity = "GROWHOUSE,DM-1,0,1.0"
		f := Found{Address: "tcp://192.0.2.11:5025"}
		Ask(t.Context(), &f, stranger.Dial)
		if f.Identity == nil || f.Dialect != "" || !strings.Contains(f.Trouble, "standard-meter") || len(f.Lines) != 1 {
			t.Errorf("unknown: %+v", f)
		}
		mute := drivertest.NewMeter()
		mute.Fate = func(string) drivertest.Fate { return drivertest.Fate{Drop: true} }
		f = Found{Address: "serial:///dev/ttyS77"}
		Ask(t.Context(), &f, mute.Dial)
		if f.Identity != nil || !strings.Contains(f.Trouble, "no answer to *IDN?") {
			t.Errorf("mute: %+v", f)
		}
		f = Found{Address: "serial:///dev/ttyS77"}
		Ask(t.Context(), &f, func(context.Context, link.Address) (io.ReadWriteCloser, error) { return nil, link.ErrBusy })
		if !strings.Contains(f.Trouble, "in use by another program") {
			t.Errorf("busy: %+v", f)
		}
		f = Found{Address: "gpib://0/5"}
		Ask(t.Context(), &f, nil)
		if !strings.Contains(f.Trouble, "not supported yet") {
			t.Errorf("unsupported: %+v", f)
		}
	})
}
