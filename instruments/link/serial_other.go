//go:build !linux

package link

import (
	"fmt"
	"io"
)

func openSerial(Address) (io.ReadWriteCloser, error) {
	return nil, fmt.Errorf("a serial line on this system is %w; Linux only", ErrUnsupported)
}

func openUSBTMC(Address) (io.ReadWriteCloser, error) {
	return nil, fmt.Errorf("a USB instrument on this system is %w; Linux only", ErrUnsupported)
}
