package practice

import (
	"io"
	"net"
	"sync"
)

// clients are the connections of one socket, so that unplugging ends them.
type clients struct {
	mu   sync.Mutex
	open map[io.Closer]bool // guarded by mu; nil once closed
}

// add counts a connection in until it is closed.
func (c *clients) add(conn net.Conn) io.ReadWriteCloser {
	c.mu.Lock()
	defer c.mu.Unlock()
	k := &client{Conn: conn, of: c}
	if c.open == nil {
		conn.Close()
		return k
	}
	c.open[k] = true
	return k
}

// close ends all connections and those that come later.
func (c *clients) close() {
	c.mu.Lock()
	open := c.open
	c.open = nil
	c.mu.Unlock()
	for k := range open {
		k.Close()
	}
}

type client struct {
	net.Conn
	of *clients
}

// Close counts the connection out.
func (k *client) Close() error {
	k.of.mu.Lock()
	delete(k.of.open, k)
	k.of.mu.Unlock()
	return k.Conn.Close()
}
