package link

import (
	"fmt"
	"net"
	"net/netip"
	"net/url"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
)

// Accepted names the forms an address may take, for messages.
const Accepted = "serial:///dev/...?baud=9600&bits=8&parity=none&stop=1&flow=none or tcp://host:port"

// Address says where an instrument is. It is comparable; for "is it the same
// port?" compare Canonical instead.
type Address struct {
	Scheme string // serial or tcp
	Path   string // serial: the device
	Host   string // tcp: host:port
	Line   Line   // serial only
	text   string
}

// Line holds the settings of a serial line.
type Line struct {
	Baud   int    // bit/s
	Bits   int    // data bits, 5 to 8
	Parity string // none, odd, even, mark, space
	Stop   string // 1, 1.5, 2
	Flow   string // none, rtscts, xonxoff
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
	case "usbtmc", "vxi11", "hislip", "gpib":
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
	"flow":   {"none", "rtscts", "xonxoff"},
}

func (l *Line) set(key, value string) error {
	if key == "flow" && value == "dtrdsr" {
		return fmt.Errorf("flow=dtrdsr: this system can't do it; use flow=none with DSR tied to DTR at the instrument, and commands short enough for its buffer")
	}
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

func (a *Address) parseTCP(u *url.URL) error {
	if u.Path != "" || u.RawQuery != "" || u.User != nil {
		return fmt.Errorf("nothing may follow the port; use tcp://host:port")
	}
	host, port, err := net.SplitHostPort(u.Host)
	if err != nil || host == "" || port == "" {
		return fmt.Errorf("needs a host and a port, such as tcp://192.0.2.10:5025")
	}
	if n, err := strconv.Atoi(port); err != nil || n < 1 || n > 65535 {
		return fmt.Errorf("port %s: use 1 to 65535", port)
	}
	a.Host = u.Host
	return nil
}

// String is the address as it was written.
func (a Address) String() string { return a.text }

// Canonical spells the port itself, whatever name it was reached by: symbolic
// links resolved, host names in lower case, line settings left out. Two
// addresses with the same Canonical are one port. A device that is not there
// keeps the name it was given.
func (a Address) Canonical() string {
	if a.Scheme == "serial" {
		if real, err := filepath.EvalSymlinks(a.Path); err == nil {
			return "serial://" + real
		}
		return "serial://" + a.Path
	}
	host, port, err := net.SplitHostPort(a.Host)
	if err != nil {
		return a.Scheme + "://" + a.Host
	}
	if ip, err := netip.ParseAddr(host); err == nil {
		host = ip.Unmap().String()
	}
	port = strings.TrimLeft(port, "0")
	return a.Scheme + "://" + net.JoinHostPort(strings.ToLower(strings.TrimSuffix(host, ".")), port)
}
