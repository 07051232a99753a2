package link

import (
	"cmp"
	"fmt"
	"net"
	"net/netip"
	"net/url"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
)

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

// hislipPort is the port IANA gives HiSLIP, and hislipName the sub-address of
// the first instrument behind it (IVI-6.1, from memory).
const (
	hislipPort = "4880"
	hislipName = "hislip0"
)

func (a *Address) parseHiSLIP(u *url.URL) error {
	if u.RawQuery != "" || u.User != nil || u.Hostname() == "" {
		return fmt.Errorf("use hislip://host, hislip://host:port or hislip://host:port/sub-address")
	}
	port := cmp.Or(u.Port(), hislipPort)
	if n, err := strconv.Atoi(port); err != nil || n < 1 || n > 65535 {
		return fmt.Errorf("port %s: use 1 to 65535", port)
	}
	a.Host = net.JoinHostPort(u.Hostname(), port)
	a.Path = cmp.Or(strings.Trim(u.Path, "/"), hislipName)
	if len(a.Path) > 256 || strings.Contains(a.Path, "/") {
		return fmt.Errorf("sub-address %q: use one name, such as %s", a.Path, hislipName)
	}
	return nil
}

// USB names a device by what it says of itself, which stays when it is plugged
// in elsewhere. An empty Serial takes the only one of its kind.
type USB struct {
	Vendor, Product string // four hexadecimal digits, lower case
	Serial          string
}

// String spells it as an address does.
func (u USB) String() string {
	return strings.TrimSuffix(u.Vendor+"-"+u.Product+"/"+u.Serial, "/")
}

var usbIDs = regexp.MustCompile(`^([0-9a-f]{4})-([0-9a-f]{4})$`)

func (a *Address) parseUSBTMC(u *url.URL) error {
	if u.RawQuery != "" || u.User != nil {
		return fmt.Errorf("nothing may follow the device; a USB instrument has no line settings")
	}
	if ids := usbIDs.FindStringSubmatch(strings.ToLower(u.Host)); ids != nil {
		a.USB = USB{ids[1], ids[2], strings.TrimPrefix(u.Path, "/")}
		return nil
	}
	if u.Host != "" || !filepath.IsAbs(u.Path) || u.Path == "/" {
		return fmt.Errorf("needs the whole path of the device after three slashes, such as usbtmc:///dev/usbtmc0, or vendor-product/serial, such as usbtmc://0957-1796/MY1234, which stays when it is plugged in elsewhere; 'nightbench ports' lists both")
	}
	a.Path = filepath.Clean(u.Path)
	return nil
}

// Canonical spells the port itself, whatever name it was reached by: symbolic
// links resolved, host names in lower case, line settings left out. Two
// addresses with the same Canonical are one port. A device that is not there
// keeps the name it was given.
func (a Address) Canonical() string {
	switch a.Scheme {
	case "serial", "usbtmc":
		path := a.Path
		if a.USB != (USB{}) {
			node, err := a.USB.node(systemRoot)
			if err != nil {
				return "usbtmc://" + a.USB.String()
			}
			path = node
		}
		if real, err := filepath.EvalSymlinks(path); err == nil {
			path = real
		}
		return a.Scheme + "://" + path
	case "hislip":
		return "hislip://" + canonicalHost(a.Host) + "/" + a.Path
	}
	return a.Scheme + "://" + canonicalHost(a.Host)
}

func canonicalHost(hostPort string) string {
	host, port, err := net.SplitHostPort(hostPort)
	if err != nil {
		return hostPort
	}
	if ip, err := netip.ParseAddr(host); err == nil {
		host = ip.Unmap().String()
	}
	return net.JoinHostPort(strings.ToLower(strings.TrimSuffix(host, ".")), strings.TrimLeft(port, "0"))
}
