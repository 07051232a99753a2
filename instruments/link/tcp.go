package link

import (
	"context"
	"errors"
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
		return dialLocked(ctx, a)
	case "usbtmc":
		return openUSBTMC(a)
	case "hislip":
		return dialHiSLIP(ctx, a)
	}
	return nil, fmt.Errorf("%q is %w; use %s", a.Scheme, ErrUnsupported, Accepted)
}

// locked is a connection that no other link of this computer has to the same place.
type locked struct {
	net.Conn
	lock io.Closer
}

// dialLocked keeps other links of this computer away while a connection is
// open, as flock does for a device: two talkers on a socket mix their replies.
func dialLocked(ctx context.Context, a Address) (io.ReadWriteCloser, error) {
	lock, err := lockAddress(a.Canonical())
	if err != nil {
		return nil, err
	}
	c, err := dialTCP(ctx, a)
	if err != nil {
		return nil, errors.Join(err, lock.Close())
	}
	return locked{c, lock}, nil
}

// Close ends the connection and then lets others have it.
func (l locked) Close() error { return errors.Join(l.Conn.Close(), l.lock.Close()) }

func dialTCP(ctx context.Context, a Address) (net.Conn, error) {
	d := net.Dialer{Timeout: connectWithin, KeepAliveConfig: keepAlive}
	c, err := d.DialContext(ctx, "tcp", a.Host)
	if err != nil {
		return nil, &Error{Op: "open", Address: a.String(), Err: openKind(err),
			Hint: "is it switched on, its network interface enabled, and no other program connected?"}
	}
	return c, nil
}
