package link

import "io"

// TMCDevice is the device file of a USB instrument, for tests that put a whole
// instrument behind it.
type TMCDevice = tmcDevice

// The requests such an instrument has to know.
const (
	TMCClear      = tmcClear
	TMCReadSTB    = tmcReadSTB
	TMCAttributes = tmcAttributes
)

// NewUSBTMC is the stream over a device.
func NewUSBTMC(d TMCDevice) (io.ReadWriteCloser, error) { return newUSBTMC(d) }
