package link

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
)

// systemRoot is where /dev and /sys are.
const systemRoot = "/"

// Device is a serial line or USB instrument that is plugged in, as the system
// lists it. Nothing is opened to find it out.
type Device struct {
	Scheme string // serial or usbtmc
	Node   string // /dev/ttyUSB0: not the same after plugging in again
	ByID   string // the name under /dev/serial/by-id that stays; empty: it has none
	USB    USB    // empty for a line on the mainboard
	Maker  string // what the USB device says of itself
	Name   string
}

// Address is the address to write into a bench file: by the name that stays,
// where there is one.
func (d Device) Address() string {
	switch {
	case d.Scheme == "usbtmc" && d.USB.Serial != "":
		return "usbtmc://" + d.USB.String()
	case d.ByID != "":
		return d.Scheme + "://" + d.ByID
	}
	return d.Scheme + "://" + d.Node
}

// Plugged lists what is plugged in, serial lines first. Root is "/", or for a
// test the folder that stands in for it.
func Plugged(root string) (found []Device, err error) {
	for _, class := range []struct{ scheme, pattern string }{
		{"serial", "sys/class/tty/*/device"}, {"usbtmc", "sys/class/usbmisc/usbtmc*/device"},
	} {
		paths, err := filepath.Glob(filepath.Join(root, class.pattern))
		if err != nil {
			return nil, err
		}
		for _, p := range paths {
			name := filepath.Base(filepath.Dir(p))
			if class.scheme == "serial" && noHardware(filepath.Dir(p)) {
				continue
			}
			d := Device{Scheme: class.scheme, Node: "/dev/" + name}
			d.describe(p)
			d.ByID = stableName(root, name)
			found = append(found, d)
		}
	}
	return found, nil
}

// noHardware tells the serial ports a kernel keeps ready for a mainboard that
// has none: their type is 0 (linux/serial_core.h, PORT_UNKNOWN).
func noHardware(dir string) bool { return readLine(dir, "type") == "0" }

// describe reads what the USB device above an interface says of itself.
func (d *Device) describe(device string) {
	dir, err := filepath.EvalSymlinks(device)
	if err != nil {
		return
	}
	for ; len(dir) > 1; dir = filepath.Dir(dir) {
		if vendor := readLine(dir, "idVendor"); vendor != "" {
			d.USB = USB{vendor, readLine(dir, "idProduct"), readLine(dir, "serial")}
			d.Maker, d.Name = readLine(dir, "manufacturer"), readLine(dir, "product")
			return
		}
	}
}

func readLine(dir, name string) string {
	text, err := os.ReadFile(filepath.Join(dir, name))
	if err != nil {
		return ""
	}
	return strings.TrimSpace(string(text))
}

// stableName finds the link under /dev/serial/by-id that leads to a device.
func stableName(root, name string) string {
	dir := filepath.Join(root, "dev/serial/by-id")
	links, err := os.ReadDir(dir)
	if err != nil {
		return ""
	}
	for _, l := range links {
		if to, err := os.Readlink(filepath.Join(dir, l.Name())); err == nil && filepath.Base(to) == name {
			return "/dev/serial/by-id/" + l.Name()
		}
	}
	return ""
}

// node finds the device file of a USB instrument now. Several that fit are an
// error: which one is meant is then a guess.
func (u USB) node(root string) (string, error) {
	all, err := Plugged(root)
	if err != nil {
		return "", err
	}
	all = slices.DeleteFunc(all, func(d Device) bool {
		return d.Scheme != "usbtmc" || d.USB.Vendor != u.Vendor || d.USB.Product != u.Product || u.Serial != "" && d.USB.Serial != u.Serial
	})
	switch len(all) {
	case 0:
		return "", fmt.Errorf("%w: no USB instrument %s is plugged in", ErrMissing, u)
	case 1:
		return all[0].Node, nil
	}
	return "", fmt.Errorf("%d USB instruments %s are plugged in; add the serial number: %s or %s", len(all), u, all[0].Address(), all[1].Address())
}
