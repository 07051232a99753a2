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

// lockAddress has no way to keep others away here.
func lockAddress(string) (io.Closer, error) { return io.NopCloser(nil), nil }
