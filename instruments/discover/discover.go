// Package discover finds instruments: what is plugged in, what answers on the
// network, and, only where it is asked to, who they are.
//
// What an unknown device is sent. Listing what is plugged in opens and sends
// nothing. Looking on the network sends one multicast question for the
// services of instruments and reads the answers. Asking who somebody is opens
// the address (which raises DTR and RTS on a serial line, and so resets some
// microcontroller boards), sends *IDN? and NL, twice, reads one line each
// time, and closes it again: no reset, no setting, nothing that switches.
package discover

import (
	"context"
	"errors"
	"fmt"
	"os"
	"strings"
	"time"

	"golang.org/x/sys/unix"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
)

// Found is a place where an instrument is or may be.
type Found struct {
	Address  string                `json:"address"` // as a bench file spells it
	Words    string                `json:"words"`   // what is known of it without asking
	Trouble  string                `json:"trouble,omitempty"`
	Identity *instruments.Identity `json:"identity,omitempty"`
	Dialect  string                `json:"dialect,omitempty"` // that its identity asks for
	Role     string                `json:"role,omitempty"`
	Lines    []string              `json:"lines,omitempty"` // for a bench file

	Device *link.Device `json:"-"` // plugged in; nil on the network
}

// Plugged lists what is plugged in. Root is "/", or stands in for it.
func Plugged(root string) ([]Found, error) {
	devices, err := link.Plugged(root)
	if err != nil {
		return nil, err
	}
	var found []Found
	for _, d := range devices {
		f := Found{Address: d.Address(), Words: describe(d), Device: &d}
		if err := unix.Access(root+d.Node, unix.R_OK|unix.W_OK); errors.Is(err, os.ErrPermission) {
			f.Trouble = "permission denied: 'nightbench ports --udev' prints the rule that lets you in"
		}
		found = append(found, f)
	}
	return found, nil
}

// describe is what a device says of itself, and where it is now.
func describe(d link.Device) string {
	words := strings.TrimSpace(d.Maker + " " + d.Name)
	switch {
	case d.USB == (link.USB{}):
		words = "serial port of the computer"
	case words == "":
		words = "USB device " + d.USB.String()
	}
	if d.USB != (link.USB{}) && d.ByID == "" && d.USB.Serial == "" {
		words += ", which has no name that stays: its number may change when it is plugged in again"
	}
	words += " (now " + d.Node + ")"
	if d.Scheme == "usbtmc" {
		words += "; this program's USB link was never tried on a device: watch it at first"
	}
	return words
}

// askWithin is allowed for one answer of a device nothing is known of.
const askWithin = 1500 * time.Millisecond

// Ask finds out who is at an address, and which dialect and lines of a bench
// file go with it. What went wrong is Trouble. See the package comment for
// what is sent.
func Ask(ctx context.Context, f *Found, dial link.Dial) {
	id, err := identify(ctx, f.Address, dial)
	if err != nil {
		f.Trouble = err.Error()
		if errors.Is(err, link.ErrTimeout) {
			f.Trouble = "no answer to *IDN?: is it on, and for a serial line are baud rate, parity and flow control as set at the instrument? give them with the address"
		}
		return
	}
	f.Identity = &id
	suggest(f)
}

func identify(ctx context.Context, address string, dial link.Dial) (id instruments.Identity, err error) {
	a, err := link.Parse(address)
	if err != nil {
		return id, err
	}
	l, err := link.Open(ctx, a, link.Options{Dial: dial, Timeout: askWithin})
	if err != nil {
		return id, err
	}
	defer func() { err = errors.Join(err, l.Close()) }()
	return scpi.New(l, scpi.Options{}).Identify(ctx)
}

// suggest finds the dialect and writes the lines.
func suggest(f *Found) {
	all, err := dialect.All()
	if err != nil {
		f.Trouble = err.Error()
		return
	}
	d, ok := dialect.Match(all, *f.Identity)
	if !ok {
		f.Trouble = fmt.Sprintf("no dialect knows it; if it keeps to the usual SCPI nodes name one of %s, else write a dialect file",
			strings.Join(standards(all), ", "))
		f.Lines = []string{fmt.Sprintf("address = %q", f.Address)}
		return
	}
	f.Dialect, f.Role = d.Head.Name, string(d.Head.Role)
	table := "[" + f.Role + "]"
	if d.Head.Role == dialect.RoleMeter {
		table = "[[meter]]"
	}
	f.Lines = []string{table, fmt.Sprintf("address = %q", f.Address), fmt.Sprintf("dialect = %q", f.Dialect)}
	if s := f.Identity.Serial; s != "" && s != "0" {
		f.Lines = append(f.Lines, fmt.Sprintf("serial = %q", s))
	}
}

// standards are the dialects that will do for an instrument nobody knows.
func standards(all []*dialect.Dialect) (names []string) {
	for _, d := range all {
		if d.Head.AcceptsAny {
			names = append(names, d.Head.Name)
		}
	}
	return names
}
