package link

import (
	"fmt"
	"io"
	"os"
	"strings"
	"time"

	"go.bug.st/serial"
	"golang.org/x/sys/unix"
)

// port is a serial line. The serial library sets the line up and keeps it
// exclusive; the bytes go through a non-blocking descriptor of our own,
// because a write through the library has no deadline and survives its Close,
// and its Close frees the descriptor before the readers have left.
type port struct {
	file *os.File
	line serial.Port
	gate *gate // flow=dtrdsr; nil: the system does the flow control
}

// openSerial opens, locks and sets up the line of a. The lock is an flock,
// which holds against root too, as the tty's own exclusive mode does not.
func openSerial(a Address) (io.ReadWriteCloser, error) {
	f, err := os.OpenFile(a.Path, os.O_RDWR|unix.O_NOCTTY|unix.O_NONBLOCK, 0)
	if err != nil {
		return nil, openKind(err)
	}
	err = control(f, func(fd int) error { return unix.Flock(fd, unix.LOCK_EX|unix.LOCK_NB) })
	if err != nil {
		f.Close()
		return nil, openKind(fmt.Errorf("lock: %w", err))
	}
	line, err := serial.Open(a.Path, a.Line.mode())
	if err != nil {
		f.Close()
		return nil, fmt.Errorf("is this a serial line that can do %s? %w", a.Line, err)
	}
	p := &port{file: f, line: line}
	if err := p.setFlow(a); err != nil {
		p.Close()
		return nil, err
	}
	if a.Line.Flow == "dtrdsr" {
		if p.gate, err = newGate(p); err != nil {
			p.Close()
			return nil, err
		}
	}
	line.ResetInputBuffer() // what came before we listened is nobody's reply
	return p, nil
}

func (l Line) mode() *serial.Mode {
	parity := map[string]serial.Parity{"none": serial.NoParity, "odd": serial.OddParity,
		"even": serial.EvenParity, "mark": serial.MarkParity, "space": serial.SpaceParity}
	stop := map[string]serial.StopBits{"1": serial.OneStopBit, "1.5": serial.OnePointFiveStopBits, "2": serial.TwoStopBits}
	return &serial.Mode{BaudRate: l.Baud, DataBits: l.Bits, Parity: parity[l.Parity], StopBits: stop[l.Stop]}
}

// setFlow sets the flow control, which the library can't, and checks that the
// driver took the frame that was asked for. A pseudo-terminal has no frame.
func (p *port) setFlow(a Address) error {
	return control(p.file, func(fd int) error {
		t, err := unix.IoctlGetTermios(fd, unix.TCGETS)
		if err != nil {
			return fmt.Errorf("read the line settings: %w", err)
		}
		if bits := frame(a.Line); t.Cflag&frameMask != bits && !isPseudo(a) {
			return fmt.Errorf("the driver did not take %s", a.Line)
		}
		switch a.Line.Flow {
		case "rtscts":
			t.Cflag |= unix.CRTSCTS
		case "xonxoff":
			t.Iflag |= unix.IXON | unix.IXOFF
		}
		if err := unix.IoctlSetTermios(fd, unix.TCSETS, t); err != nil {
			return fmt.Errorf("set the flow control: %w", err)
		}
		return nil
	})
}

const frameMask = unix.CSIZE | unix.CSTOPB | unix.PARENB

// frame is the part of the control flags that says bits, parity and stop.
func frame(l Line) uint32 {
	bits := map[int]uint32{5: unix.CS5, 6: unix.CS6, 7: unix.CS7, 8: unix.CS8}[l.Bits]
	if l.Stop != "1" {
		bits |= unix.CSTOPB
	}
	if l.Parity != "none" {
		bits |= unix.PARENB
	}
	return bits
}

// isPseudo tells a pseudo-terminal, by where its device really is.
func isPseudo(a Address) bool {
	return strings.HasPrefix(strings.TrimPrefix(a.Canonical(), "serial://"), "/dev/pts/")
}

// Read waits for bytes; Close ends it.
func (p *port) Read(b []byte) (int, error) { return p.file.Read(b) }

// Write waits until the system has taken the bytes; Close ends it.
func (p *port) Write(b []byte) (int, error) {
	if p.gate != nil {
		return p.gate.write(b)
	}
	return p.file.Write(b)
}

// Break holds the line at space for a quarter to half a second (tcsendbreak(3)).
func (p *port) Break() error {
	return control(p.file, func(fd int) error { return unix.IoctlSetInt(fd, unix.TCSBRK, 0) })
}

// ready tells whether the other side holds DSR, which an instrument drops
// while its buffer is full.
func (p *port) ready() (bool, error) {
	bits, err := p.line.GetModemStatusBits()
	if err != nil {
		return false, err
	}
	return bits.DSR, nil
}

// send hands a few bytes to the system.
func (p *port) send(b []byte) (int, error) { return p.file.Write(b) }

// drainWithin bounds the wait for the last bytes when a line is closed:
// 400 characters at 9600 bit/s with some room.
const drainWithin = 500 * time.Millisecond

// Close lets the last bytes leave (they may be "output off"), throws away
// what flow control holds back, for which the system would wait half a minute
// when closing, and closes.
func (p *port) Close() error {
	if p.gate != nil {
		p.gate.close()
	}
	for end := time.Now().Add(drainWithin); p.unsent() > 0 && time.Now().Before(end); {
		time.Sleep(5 * time.Millisecond)
	}
	if p.unsent() > 0 {
		p.line.ResetOutputBuffer()
	}
	err := p.file.Close()
	if e := p.line.Close(); err == nil {
		err = e
	}
	return err
}

// unsent is the count of bytes that have not left the system yet; 0 when the
// device cannot tell.
func (p *port) unsent() (n int) {
	err := control(p.file, func(fd int) (err error) {
		n, err = unix.IoctlGetInt(fd, unix.TIOCOUTQ)
		return err
	})
	if err != nil {
		return 0
	}
	return n
}

// control runs fn on the descriptor of f.
func control(f *os.File, fn func(fd int) error) error {
	raw, err := f.SyscallConn()
	if err != nil {
		return err
	}
	var inner error
	if err := raw.Control(func(fd uintptr) { inner = fn(int(fd)) }); err != nil {
		return err
	}
	return inner
}
