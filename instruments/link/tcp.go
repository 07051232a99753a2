package link

import (
	"context"
	"fmt"
	"io"
	"net"
	"time"
)

// connectWithin bounds a TCP connect when the context does not.
const connectWithin = 5 * time.Second

// keepAlive finds a power-cycled instrument on an idle connection within half
// a minute, instead of the system's two hours.
var keepAlive = net.KeepAliveConfig{Enable: true, Idle: 10 * time.Second, Interval: 5 * time.Second, Count: 4}

// DialAddress opens the real stream of an address.
func DialAddress(ctx context.Context, a Address) (io.ReadWriteCloser, error) {
	switch a.Scheme {
	case "serial":
		return openSerial(a)
	case "tcp":
		return dialTCP(ctx, a)
	case "usbtmc":
		return openUSBTMC(a)
	case "hislip":
		return dialHiSLIP(ctx, a)
	}
	return nil, fmt.Errorf("%q is %w; use %s", a.Scheme, ErrUnsupported, Accepted)
}

func dialTCP(ctx context.Context, a Address) (net.Conn, error) {
	d := net.Dialer{Timeout: connectWithin, KeepAliveConfig: keepAlive}
	c, err := d.DialContext(ctx, "tcp", a.Host)
	if err != nil {
		return nil, &Error{Op: "open", Address: a.String(), Err: openKind(err),
			Hint: "is it switched on, its network interface enabled, and no other program connected?"}
	}
	return c, nil
}
