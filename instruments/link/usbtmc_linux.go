package link

import (
	"errors"
	"fmt"
	"io"
	"unsafe"

	"golang.org/x/sys/unix"
)

// tmcFile is the device file itself. Its calls block in the driver, so they
// bypass the runtime's poller.
type tmcFile int

// openUSBTMC opens, locks and sets up the device of a.
func openUSBTMC(a Address) (io.ReadWriteCloser, error) {
	path := a.Path
	if path == "" {
		var err error
		if path, err = a.USB.node(systemRoot); err != nil {
			return nil, err
		}
	}
	fd, err := unix.Open(path, unix.O_RDWR|unix.O_CLOEXEC, 0)
	if err != nil {
		return nil, openKind(err)
	}
	f := tmcFile(fd)
	if err := unix.Flock(fd, unix.LOCK_EX|unix.LOCK_NB); err != nil {
		return nil, errors.Join(openKind(fmt.Errorf("lock: %w", err)), f.Close())
	}
	u, err := newUSBTMC(f)
	if err != nil {
		return nil, errors.Join(fmt.Errorf("is %s a USB instrument? %w", path, err), f.Close())
	}
	return u, nil
}

func (f tmcFile) Read(b []byte) (int, error) {
	return again(func() (int, error) { return unix.Read(int(f), b) })
}
func (f tmcFile) Write(b []byte) (int, error) {
	return again(func() (int, error) { return unix.Write(int(f), b) })
}
func (f tmcFile) Close() error { return unix.Close(int(f)) }

// again repeats a call that a signal interrupted before it did anything.
func again(call func() (int, error)) (int, error) {
	for {
		n, err := call()
		if err != unix.EINTR {
			return max(n, 0), err
		}
	}
}

// Control is an ioctl.
func (f tmcFile) Control(request uint, arg []byte) error {
	var p unsafe.Pointer
	if len(arg) > 0 {
		p = unsafe.Pointer(&arg[0])
	}
	if _, _, errno := unix.Syscall(unix.SYS_IOCTL, uintptr(f), uintptr(request), uintptr(p)); errno != 0 {
		return errno
	}
	return nil
}
