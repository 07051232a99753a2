package link

import (
	"fmt"
	"net/url"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
)

// Accepted names the forms an address may take, for messages.
const Accepted = "serial:///dev/...?baud=9600&bits=8&parity=none&stop=1&flow=none, tcp://host:port, usbtmc:///dev/usbtmc0, usbtmc://vvvv-pppp/SERIAL or hislip://host"

// Address says where an instrument is. It is comparable; for "is it the same
// port?" compare Canonical instead.
type Address struct {
	Scheme string // serial, tcp, usbtmc or hislip
	Path   string // serial, usbtmc: the device; hislip: the sub-address
	Host   string // tcp, hislip: host:port
	USB    USB    // usbtmc: who is meant, where no device is given
	Line   Line   // serial only
	text   string
}

// Line holds the settings of a serial line.
type Line struct {
	Baud   int    // bit/s
	Bits   int    // data bits, 5 to 8
	Parity string // none, odd, even, mark, space
	Stop   string // 1, 1.5, 2
	Flow   string // none, rtscts, xonxoff, dtrdsr
}

// String spells the line as technicians do, such as "9600 8N1 none".
func (l Line) String() string {
	return fmt.Sprintf("%d %d%c%s %s", l.Baud, l.Bits, strings.ToUpper(l.Parity)[0], l.Stop, l.Flow)
}

// DefaultLine is what a serial address means when it says nothing else: the
// commonest setting of bench instruments (common practice, no source).
var DefaultLine = Line{Baud: 9600, Bits: 8, Parity: "none", Stop: "1", Flow: "none"}

// Parse reads an address. Unknown schemes, keys and values are errors that
// name what is accepted.
func Parse(address string) (Address, error) {
	u, err := url.Parse(address)
	if err != nil {
		return Address{}, fmt.Errorf("address %q: %w; use %s", address, err, Accepted)
	}
	a := Address{Scheme: u.Scheme, text: address}
	switch u.Scheme {
	case "serial":
		err = a.parseSerial(u)
	case "tcp":
		err = a.parseTCP(u)
	case "usbtmc":
		err = a.parseUSBTMC(u)
	case "hislip":
		err = a.parseHiSLIP(u)
	case "vxi11", "gpib":
		err = fmt.Errorf("%s:// is %w; use %s", u.Scheme, ErrUnsupported, Accepted)
	default:
		err = fmt.Errorf("unknown kind of address; use %s", Accepted)
	}
	if err != nil {
		return Address{}, fmt.Errorf("address %q: %w", address, err)
	}
	return a, nil
}

func (a *Address) parseSerial(u *url.URL) error {
	if u.Host != "" || !filepath.IsAbs(u.Path) || u.Path == "/" {
		return fmt.Errorf("a serial address needs the whole path of the device after three slashes, such as serial:///dev/serial/by-id/usb-XYZ")
	}
	a.Path, a.Line = filepath.Clean(u.Path), DefaultLine
	q, err := url.ParseQuery(u.RawQuery)
	if err != nil {
		return err
	}
	for key, values := range q {
		if len(values) != 1 {
			return fmt.Errorf("%s is given %d times", key, len(values))
		}
		if err := a.Line.set(key, values[0]); err != nil {
			return err
		}
	}
	return nil
}

// lineWords are the words a line setting may take.
var lineWords = map[string][]string{
	"parity": {"none", "odd", "even", "mark", "space"},
	"stop":   {"1", "1.5", "2"},
	"flow":   {"none", "rtscts", "xonxoff", "dtrdsr"},
}

func (l *Line) set(key, value string) error {
	if words, ok := lineWords[key]; ok {
		if !slices.Contains(words, value) {
			return fmt.Errorf("%s=%s: use one of %s", key, value, strings.Join(words, ", "))
		}
		*map[string]*string{"parity": &l.Parity, "stop": &l.Stop, "flow": &l.Flow}[key] = value
		return nil
	}
	n, err := strconv.Atoi(value)
	switch {
	case key == "baud" && err == nil && n >= 50 && n <= 4_000_000:
		l.Baud = n
	case key == "bits" && err == nil && n >= 5 && n <= 8:
		l.Bits = n
	case key == "baud":
		return fmt.Errorf("baud=%s: use a whole number of bit/s from 50 to 4000000", value)
	case key == "bits":
		return fmt.Errorf("bits=%s: use 5, 6, 7 or 8", value)
	default:
		return fmt.Errorf("unknown key %q; use baud, bits, parity, stop, flow", key)
	}
	return nil
}

// String is the address as it was written.
func (a Address) String() string { return a.text }
