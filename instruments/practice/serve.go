package practice

import (
	"bytes"
	"errors"
	"io"
	"os"
	"time"

	"golang.org/x/sys/unix"

	"nightbench/instruments/scpi"
)

// mostMessage bounds a message; what is longer is thrown away up to its NL and queues -363, as an instrument's input buffer would.
const mostMessage = 4096

// patience is how long a reply waits for a client that does not read, wall time.
const patience = 2 * time.Second

// Serve speaks on a stream until it ends or the bench is closed. It returns at once.
func (i *Instrument) Serve(stream io.ReadWriteCloser) {
	forget := i.bench.keep(stream)
	messages := make(chan []byte, 64)
	i.bench.spawn(func() {
		defer close(messages)
		i.listen(stream, messages)
	})
	i.bench.spawn(func() {
		defer forget()
		for m := range messages {
			i.hear(stream, m)
		}
	})
}

// keep remembers what has to be closed; a bench that is closed already closes it at
// once. What has been closed is forgotten, so that clients may come and go all night.
func (b *Bench) keep(c io.Closer) (forget func()) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.ctx.Err() != nil {
		c.Close()
		return func() {}
	}
	b.open[c] = true
	return func() {
		b.mu.Lock()
		defer b.mu.Unlock()
		if b.open[c] {
			delete(b.open, c)
			c.Close() // its client has gone, or it has been told what to know
		}
	}
}

// overlong stands for a message that was thrown away for its length.
var overlong = make([]byte, mostMessage+1)

// listen cuts the stream into messages at NL, those within a block apart. Urgent
// ones are obeyed here, past those that wait.
func (i *Instrument) listen(stream io.Reader, messages chan<- []byte) {
	cut := scpi.Splitter{Limit: mostMessage}
	buf := make([]byte, 1024)
	for {
		n, err := stream.Read(buf)
		cut.Feed(buf[:n])
		for {
			m, whole, tooLong := cut.Next()
			if !whole {
				break
			}
			if tooLong != nil {
				m = overlong
			}
			if !i.dead.Load() && i.urgent != nil && i.urgent(m) {
				continue
			}
			select {
			case messages <- bytes.Clone(m):
			case <-i.bench.ctx.Done():
				return
			}
		}
		if err != nil {
			return
		}
	}
}

// hear carries one message out and sends what comes of it, through the faults of the wire.
func (i *Instrument) hear(stream io.Writer, m []byte) {
	if i.dead.Load() {
		return // no mains: nobody hears it
	}
	echo, others := i.bench.heard(i.Name)
	if echo {
		write(stream, append(bytes.Clone(m), '\n'))
	}
	for _, says := range others {
		i.reply(stream, i.say([]byte(says)))
	}
	i.reply(stream, i.say(m))
}

// say carries one message out when it is the instrument's turn: what came in turn first, then the message.
func (i *Instrument) say(m []byte) []byte {
	select {
	case i.turn <- struct{}{}:
	case <-i.bench.ctx.Done():
		return nil
	}
	defer func() { <-i.turn }()
	i.catchUp()
	if len(m) > mostMessage {
		i.device.Push(scpi.NewFault(scpi.InputOverrun, ""))
		return nil
	}
	return i.answer(i.bench.ctx, m)
}

// inTurn has f done before the next message is carried out.
func (i *Instrument) inTurn(f func()) {
	i.mu.Lock()
	defer i.mu.Unlock()
	i.due = append(i.due, f)
}

func (i *Instrument) catchUp() {
	i.mu.Lock()
	due := i.due
	i.due = nil
	i.mu.Unlock()
	for _, f := range due {
		f()
	}
}

// reply sends a reply as the faults of the wire leave it.
func (i *Instrument) reply(stream io.Writer, reply []byte) {
	if len(reply) == 0 || i.bench.ctx.Err() != nil {
		return
	}
	s := i.bench.spoil(i.Name, reply)
	if s.wait > 0 && i.bench.world.clock.Wait(i.bench.ctx, s.wait) != nil {
		return
	}
	if len(s.out) > 0 && !i.dead.Load() {
		write(stream, s.out)
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
