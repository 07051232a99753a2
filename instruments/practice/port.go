package practice

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"path/filepath"

	"github.com/creack/pty"
)

// port is where an instrument is reached: a pseudo-terminal, perhaps under a name
// that stays, or a loopback socket.
type port struct {
	link   string // the name that stays: a symbolic link; empty: none
	listen string // the socket's address; empty: a pseudo-terminal
	close  func() // unplugs it; nil: not served
}

// ServePTY opens a pseudo-terminal, raw, and serves the instrument on it. The
// address is that of the side a client opens.
func (i *Instrument) ServePTY() (address string, err error) { return i.ServePTYAs("") }

// ServePTYAs is ServePTY under a name that stays when the instrument is unplugged and
// plugged in again, as the system's own /dev/serial/by-id does. The folder has to be there.
func (i *Instrument) ServePTYAs(link string) (address string, err error) {
	t, err := i.openPTY()
	if err != nil {
		return "", err
	}
	i.mu.Lock()
	i.port = port{link: link}
	i.mu.Unlock()
	if err := i.plug(t); err != nil {
		return "", err
	}
	if link != "" {
		return "serial://" + link, nil
	}
	return "serial://" + t.slave.Name(), nil
}

// terminal is both sides of a pseudo-terminal.
type terminal struct{ master, slave *os.File }

func (t terminal) close() error { return errors.Join(t.master.Close(), t.slave.Close()) }

func (i *Instrument) openPTY() (t terminal, err error) {
	if t.master, t.slave, err = pty.Open(); err != nil {
		return t, fmt.Errorf("practice %s: no pseudo-terminal: %w", i.Name, err)
	}
	err = raw(t.slave)
	if err == nil {
		t.master, err = interruptible(t.master)
	}
	if err != nil {
		return t, errors.Join(fmt.Errorf("practice %s: %w", i.Name, err), t.close())
	}
	return t, nil
}

// plug serves a pseudo-terminal. Its own side is held open, so that a client may come and go.
func (i *Instrument) plug(t terminal) error {
	i.mu.Lock()
	defer i.mu.Unlock()
	if l := i.port.link; l != "" {
		if err := renameLink(t.slave.Name(), l); err != nil {
			return errors.Join(fmt.Errorf("practice %s: %w", i.Name, err), t.close())
		}
	}
	forget, ours := i.bench.keep(t.slave), i.bench.keep(t.master)
	i.port.close = func() { forget(); ours() }
	i.Serve(t.master)
	return nil
}

// renameLink points a symbolic link at a target, replacing the one there.
func renameLink(target, link string) error {
	next := filepath.Join(filepath.Dir(link), "."+filepath.Base(link))
	if err := os.Remove(next); err != nil && !errors.Is(err, os.ErrNotExist) {
		return err
	}
	if err := os.Symlink(target, next); err != nil {
		return err
	}
	return os.Rename(next, link)
}

// unname takes the name that stays away.
func (p *port) unname() {
	if p.link != "" {
		os.Remove(p.link) // left behind it leads nowhere
	}
}

// ServeTCP listens on a loopback address and serves the instrument to any number of clients.
func (i *Instrument) ServeTCP(ctx context.Context, listen string) (address string, err error) {
	l, err := (&net.ListenConfig{}).Listen(ctx, "tcp", listen)
	if err != nil {
		return "", fmt.Errorf("practice %s: %w", i.Name, err)
	}
	i.mu.Lock()
	i.port = port{listen: l.Addr().String()}
	i.mu.Unlock()
	i.accept(l)
	return "tcp://" + l.Addr().String(), nil
}

func (i *Instrument) accept(l net.Listener) {
	forget := i.bench.keep(l)
	clients := &clients{open: map[io.Closer]bool{}}
	i.mu.Lock()
	i.port.close = func() { forget(); clients.close() }
	i.mu.Unlock()
	i.bench.spawn(func() {
		for {
			conn, err := l.Accept()
			if err != nil {
				return
			}
			i.Serve(clients.add(conn))
		}
	})
}

// unplug takes the port away. Lifted, the instrument is back: a pseudo-terminal under
// another name, a socket where it was.
func (i *Instrument) unplug() (lift func(), err error) {
	i.mu.Lock()
	p := i.port
	i.mu.Unlock()
	switch {
	case p.close == nil:
		return nil, fmt.Errorf("%s is on no port of the practice bench's own", i.Name)
	case p.listen != "":
		p.close()
		return func() { i.listenAgain(p.listen) }, nil
	}
	next, err := i.openPTY() // while the old name is still taken, so that the new one is another
	if err != nil {
		return nil, err
	}
	i.bench.keep(next.slave)
	i.bench.keep(next.master)
	p.unname()
	p.close()
	return func() {
		if i.plug(next) != nil {
			next.close() // the folder of names is gone: it stays unplugged
		}
	}, nil
}

// listenAgain listens where the instrument listened before; taken meanwhile, it stays away.
func (i *Instrument) listenAgain(where string) {
	l, err := (&net.ListenConfig{}).Listen(i.bench.ctx, "tcp", where)
	if err == nil {
		i.accept(l)
	}
}
