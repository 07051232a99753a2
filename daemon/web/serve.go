package web

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"net/http"
	"os"
	"path/filepath"
	"sync"
	"time"
)

// Bounds on a connection, wall time.
const (
	headerLimit = 5 * time.Second
	readLimit   = 30 * time.Second
	answerLimit = 3 * time.Minute // Outputs off waits for the board to bleed down
	idleLimit   = 2 * time.Minute
	closeLimit  = 3 * time.Second // for answers under way when the daemon ends
)

// Serve answers on the listeners until ctx ends, then says goodbye to the
// watchers, lets answers under way finish for a bounded time, and closes
// everything. Only loopback addresses and unix sockets are served. It returns
// nil when ctx ended it.
func (s *Server) Serve(ctx context.Context, listeners ...net.Listener) error {
	server := &http.Server{
		Handler: s, ConnContext: markPeer, ReadHeaderTimeout: headerLimit, ReadTimeout: readLimit, WriteTimeout: answerLimit, IdleTimeout: idleLimit,
		MaxHeaderBytes: 64 << 10, ErrorLog: slog.NewLogLogger(s.o.Log.Handler(), slog.LevelWarn),
	}
	for _, l := range listeners {
		if err := near(l.Addr()); err != nil {
			return errors.Join(err, closeAll(listeners))
		}
	}
	failed := make(chan error, len(listeners))
	var serving sync.WaitGroup
	for _, l := range listeners {
		serving.Go(func() { failed <- server.Serve(l) })
	}
	var err error
	select {
	case <-ctx.Done():
	case err = <-failed:
	}
	err = errors.Join(err, s.shut(server))
	serving.Wait()
	return err
}

// shut ends a server politely, then not.
func (s *Server) shut(server *http.Server) error {
	ctx, cancel := context.WithTimeout(context.Background(), closeLimit)
	defer cancel()
	err := s.Close(ctx)
	if server.Shutdown(ctx) != nil { // an answer is still under way
		err = errors.Join(err, server.Close())
	}
	return err
}

func closeAll(ls []net.Listener) (err error) {
	for _, l := range ls {
		err = errors.Join(err, l.Close())
	}
	return err
}

// near refuses an address that other computers can reach.
func near(a net.Addr) error {
	tcp, ok := a.(*net.TCPAddr)
	if ok && !tcp.IP.IsLoopback() {
		return fmt.Errorf("serve on %s: only loopback is served, such as 127.0.0.1:0", a)
	}
	return nil
}

// longestPath is what sun_path holds besides its final NUL (unix(7)).
const longestPath = 107

// ListenSocket listens on a unix socket at path that only its owner can open.
// It is made with its mode in a folder nobody else can enter, then moved into
// place; a socket left by a daemon that died is replaced, one that answers is an error.
func ListenSocket(path string) (net.Listener, error) {
	if len(path) > longestPath {
		return nil, fmt.Errorf("socket %s: a socket's path has at most %d characters: choose a shorter state folder with --state", path, longestPath)
	}
	if c, err := net.Dial("unix", path); err == nil {
		c.Close()
		return nil, fmt.Errorf("socket %s: another daemon answers there; stop it, or choose another state folder with --state", path)
	}
	dir, err := os.MkdirTemp(filepath.Dir(path), ".s")
	if err != nil {
		return nil, fmt.Errorf("socket %s: %w", path, err)
	}
	defer os.RemoveAll(dir)
	made := filepath.Join(dir, "s")
	l, err := net.ListenUnix("unix", &net.UnixAddr{Name: made, Net: "unix"})
	if err != nil {
		return nil, fmt.Errorf("socket %s: %w", path, err)
	}
	l.SetUnlinkOnClose(false)
	if err := errors.Join(os.Chmod(made, 0o600), os.Rename(made, path)); err != nil {
		return nil, errors.Join(fmt.Errorf("socket %s: %w", path, err), l.Close())
	}
	return &ownSocket{UnixListener: l, path: path}, nil
}

// ownSocket removes its file when it closes.
type ownSocket struct {
	*net.UnixListener
	path string
	once sync.Once
}

func (l *ownSocket) Close() error {
	err := net.ErrClosed
	l.once.Do(func() { err = errors.Join(l.UnixListener.Close(), os.Remove(l.path)) })
	return err
}
