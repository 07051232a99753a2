package link

import (
	"errors"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// system is a computer with a mainboard port, one the kernel keeps ready for a
// board that has none, a USB serial adapter and two scopes of one kind.
func system(t *testing.T) string {
	const usb = "sys/devices/pci0000:00/usb1/"
	return tree(t,
		"sys/class/tty/tty1/dev = 4:1",
		"sys/class/tty/ttyS0/device -> ../../../devices/pnp0/", "sys/class/tty/ttyS0/type = 4", "sys/devices/pnp0/",
		"sys/class/tty/ttyS1/device -> ../../../devices/pnp0/", "sys/class/tty/ttyS1/type = 0",
		"sys/class/tty/ttyUSB0/device -> ../../../../"+usb+"1-1/1-1:1.0/ttyUSB0/", usb+"1-1/1-1:1.0/ttyUSB0/",
		usb+"1-1/idVendor = 0403", usb+"1-1/idProduct = 6001", usb+"1-1/serial = A50285BI", usb+"1-1/manufacturer = Cableworks", usb+"1-1/product = Serial cable",
		"dev/serial/by-id/usb-Cableworks_A50285BI-if00-port0 -> ../../ttyUSB0",
		"sys/class/usbmisc/usbtmc0/device -> ../../../../"+usb+"1-2/1-2:1.0/", usb+"1-2/1-2:1.0/",
		usb+"1-2/idVendor = 0957", usb+"1-2/idProduct = 1796", usb+"1-2/serial = MY1",
		"sys/class/usbmisc/usbtmc1/device -> ../../../../"+usb+"1-3/1-3:1.0/", usb+"1-3/1-3:1.0/",
		usb+"1-3/idVendor = 0957", usb+"1-3/idProduct = 1796", usb+"1-3/serial = MY2",
		"sys/class/usbmisc/hiddev0/device -> ../../../devices/pnp0/",
	)
}

func TestPlugged(t *testing.T) {
	got, err := Plugged(system(t))
	if err != nil {
		t.Fatal(err)
	}
	want := []Device{
		{Scheme: "serial", Node: "/dev/ttyS0"},
		{Scheme: "serial", Node: "/dev/ttyUSB0", ByID: "/dev/serial/by-id/usb-Cableworks_A50285BI-if00-port0",
			USB: USB{"0403", "6001", "A50285BI"}, Maker: "Cableworks", Name: "Serial cable"},
		{Scheme: "usbtmc", Node: "/dev/usbtmc0", USB: USB{"0957", "1796", "MY1"}},
		{Scheme: "usbtmc", Node: "/dev/usbtmc1", USB: USB{"0957", "1796", "MY2"}},
	}
	if d := cmp.Diff(want, got); d != "" {
		t.Error(d)
	}
	for n, want := range []string{"serial:///dev/ttyS0", "serial:///dev/serial/by-id/usb-Cableworks_A50285BI-if00-port0", "usbtmc://0957-1796/MY1", "usbtmc://0957-1796/MY2"} {
		if a := got[n].Address(); a != want {
			t.Errorf("address %s, want %s", a, want)
		}
		if _, err := Parse(got[n].Address()); err != nil {
			t.Error(err)
		}
	}
}

// A USB instrument is found by what it says of itself, wherever it is plugged in.
func TestUSBNode(t *testing.T) {
	root := system(t)
	if node, err := (USB{"0957", "1796", "MY2"}).node(root); err != nil || node != "/dev/usbtmc1" {
		t.Errorf("%s, %v", node, err)
	}
	if _, err := (USB{"0957", "1796", ""}).node(root); err == nil || !strings.Contains(err.Error(), "2 USB instruments 0957-1796 are plugged in; add the serial number: usbtmc://0957-1796/MY1") {
		t.Errorf("two of a kind: %v", err)
	}
	if _, err := (USB{"0957", "1796", "MY3"}).node(root); !errors.Is(err, ErrMissing) {
		t.Errorf("another serial number: %v", err)
	}
}
