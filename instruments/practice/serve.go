package practice

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"time"

	"github.com/creack/pty"
	"golang.org/x/sys/unix"
)

// mostMessage bounds a message; what is longer is thrown away up to its NL, as an instrument's input buffer would.
const mostMessage = 4096

// patience is how long a reply waits for a client that does not read, wall time.
const patience = 2 * time.Second

// Serve speaks on a stream until it ends or the bench is closed. It returns at once.
func (i *Instrument) Serve(stream io.ReadWriteCloser) {
	i.bench.keep(stream)
	messages := make(chan []byte, 64)
	i.bench.wg.Go(func() {
		defer close(messages)
		i.listen(stream, messages)
	})
	i.bench.wg.Go(func() {
		for m := range messages {
			reply := i.answer(i.bench.ctx, m)
			if len(reply) > 0 && i.bench.ctx.Err() == nil {
				write(stream, reply)
			}
		}
	})
}

// keep remembers what has to be closed; a bench that is closed already closes it at once.
func (b *Bench) keep(c io.Closer) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.ctx.Err() != nil {
		c.Close()
		return
	}
	b.open = append(b.open, c)
}

// listen cuts the stream into messages by NL. Urgent ones are obeyed here, past those that wait.
func (i *Instrument) listen(stream io.Reader, messages chan<- []byte) {
	var line []byte
	buf := make([]byte, 1024)
	for {
		n, err := stream.Read(buf)
		for _, c := range buf[:n] {
			if c != '\n' {
				if len(line) <= mostMessage {
					line = append(line, c)
				}
				continue
			}
			m := bytes.Clone(line)
			line = line[:0]
			if len(m) > mostMessage || i.urgent != nil && i.urgent(m) {
				continue
			}
			select {
			case messages <- m:
			case <-i.bench.ctx.Done():
				return
			}
		}
		if err != nil {
			return
		}
	}
}

// write sends a reply; a client that does not read loses it, as a serial line would.
func write(stream io.Writer, reply []byte) {
	type deadliner interface{ SetWriteDeadline(time.Time) error }
	if d, ok := stream.(deadliner); ok {
		if d.SetWriteDeadline(time.Now().Add(patience)) == nil {
			defer d.SetWriteDeadline(time.Time{})
		}
	}
	if _, err := stream.Write(reply); err != nil && !errors.Is(err, os.ErrDeadlineExceeded) {
		return // the stream is over; listen notices
	}
}

// ServePTY opens a pseudo-terminal, raw, and serves the instrument on it. The
// address is that of the side a client opens.
func (i *Instrument) ServePTY() (address string, err error) {
	master, slave, err := pty.Open()
	if err != nil {
		return "", fmt.Errorf("practice %s: no pseudo-terminal: %w", i.Name, err)
	}
	err = raw(slave)
	if err == nil {
		master, err = interruptible(master)
	}
	if err != nil {
		return "", errors.Join(fmt.Errorf("practice %s: %w", i.Name, err), master.Close(), slave.Close())
	}
	i.bench.keep(slave) // held open, so that a client may come and go
	i.Serve(master)
	return "serial://" + slave.Name(), nil
}

// interruptible gives the same file, where closing ends a read that waits even
// while a client still holds the other side; a file that was opened blocking does not.
func interruptible(f *os.File) (*os.File, error) {
	fd, err := unix.FcntlInt(f.Fd(), unix.F_DUPFD_CLOEXEC, 0)
	if err != nil {
		return f, err
	}
	if err := unix.SetNonblock(fd, true); err != nil {
		return f, errors.Join(err, unix.Close(fd))
	}
	return os.NewFile(uintptr(fd), f.Name()), f.Close()
}

// raw switches off all that a terminal does to bytes.
func raw(f *os.File) error {
	t, err := unix.IoctlGetTermios(int(f.Fd()), unix.TCGETS)
	if err != nil {
		return err
	}
	t.Iflag &^= unix.IGNBRK | unix.BRKINT | unix.PARMRK | unix.ISTRIP | unix.INLCR | unix.IGNCR | unix.ICRNL | unix.IXON
	t.Oflag &^= unix.OPOST
	t.Lflag &^= unix.ECHO | unix.ECHONL | unix.ICANON | unix.ISIG | unix.IEXTEN
	t.Cflag = t.Cflag&^(unix.CSIZE|unix.PARENB) | unix.CS8
	return unix.IoctlSetTermios(int(f.Fd()), unix.TCSETS, t)
}

// ServeTCP listens on a loopback address and serves the instrument to one client after the other.
func (i *Instrument) ServeTCP(ctx context.Context, listen string) (address string, err error) {
	l, err := (&net.ListenConfig{}).Listen(ctx, "tcp", listen)
	if err != nil {
		return "", fmt.Errorf("practice %s: %w", i.Name, err)
	}
	i.bench.keep(l)
	i.bench.wg.Go(func() {
		for {
			conn, err := l.Accept()
			if err != nil {
				return
			}
			i.Serve(conn)
		}
	})
	return "tcp://" + l.Addr().String(), nil
}
