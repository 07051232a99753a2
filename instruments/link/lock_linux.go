package link

import (
	"errors"
	"fmt"
	"io"
	"net"
	"syscall"
)

// lockAddress holds an address for this program, for all users of the
// computer: a name in the abstract space of Unix sockets (unix(7)) is taken by
// one at a time, lies in no folder, and ends with its program, however that ends.
func lockAddress(canonical string) (io.Closer, error) {
	l, err := net.ListenUnix("unix", &net.UnixAddr{Net: "unix", Name: "@nightbench/" + lockName(canonical)})
	if errors.Is(err, syscall.EADDRINUSE) {
		return nil, fmt.Errorf("%w: a bench or an ask on this computer is connected to it", ErrBusy)
	}
	return l, err
}

// lockName keeps within the 107 bytes that the name of a socket may have; the end tells ports apart.
func lockName(canonical string) string {
	const most = 90
	return canonical[max(0, len(canonical)-most):]
}
