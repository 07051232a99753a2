package drivertest

import (
	"context"
	"io"
	"net"
	"regexp"
	"slices"
	"strings"
	"sync"
	"time"

	"nightbench/instruments/link"
)

// Maker is an instrument of some maker's family, written down as rules: what it
// hears, and what it does and answers, in the words of its manual. It knows
// nothing of dialect files, so that a slip in one shows in the other.
type Maker struct {
	End   string        // of its replies
	Least time.Duration // a message that comes sooner after the last is lost
	Most  int           // a longer message is lost; 0: no bound
	Deaf  func(message string) bool
	Echo  bool // each message comes back before its reply
	// Instead are replies, without their end, given in place of the rules'.
	Instead map[string]string

	mu      sync.Mutex // guards what the rules touch, and what follows
	rules   []rule
	unknown func(message string)
	got     []string
	last    time.Time
	conn    net.Conn
}

// rule is what is done when a whole message is of a pattern.
type rule struct {
	pattern *regexp.Regexp
	do      func(parts []string) string
}

// on adds a rule: do gets the parts in brackets, from 1, and gives the reply, or nothing.
func (m *Maker) on(pattern string, do func(parts []string) string) {
	m.rules = append(m.rules, rule{regexp.MustCompile("^(?:" + pattern + ")$"), do})
}

// says adds a rule for a query with a fixed answer.
func (m *Maker) says(pattern, answer string) { m.on(pattern, func([]string) string { return answer }) }

// takes adds a rule for messages that change nothing here.
func (m *Maker) takes(pattern string) { m.on(pattern, func([]string) string { return "" }) }

// Dial gives one end of a pipe and listens on the other.
func (m *Maker) Dial(context.Context, link.Address) (io.ReadWriteCloser, error) {
	near, far := net.Pipe()
	m.Do(func() { m.conn = far })
	go m.serve(far)
	return near, nil
}

// later does something after a while, as an instrument does that holds a reply
// back; what it gives is sent then.
func (m *Maker) later(d time.Duration, do func() string) {
	time.AfterFunc(d, func() {
		var reply string
		var c net.Conn
		m.Do(func() { reply, c = do(), m.conn })
		if reply != "" {
			c.Write([]byte(reply + m.End)) // whoever has hung up meanwhile misses it
		}
	})
}

// Received is every message so far, in order.
func (m *Maker) Received() []string {
	m.mu.Lock()
	defer m.mu.Unlock()
	return slices.Clone(m.got)
}

// Do runs f while no rule runs.
func (m *Maker) Do(f func()) {
	m.mu.Lock()
	defer m.mu.Unlock()
	f()
}

func (m *Maker) serve(c net.Conn) {
	defer c.Close()
	var message []byte
	for b := make([]byte, 256); ; {
		n, err := c.Read(b)
		if err != nil {
			return
		}
		for _, x := range b[:n] {
			switch x {
			case 3: // device clear of some: forgets the message in hand
				message = nil
			case '\r', '\n':
				said := strings.TrimSpace(string(message))
				reply := m.hear(said)
				if m.Echo && said != "" {
					reply = said + m.End + reply
				}
				if _, err := c.Write([]byte(reply)); err != nil {
					return
				}
				message = nil
			default:
				message = append(message, x)
			}
		}
	}
}

// hear carries one message out.
func (m *Maker) hear(message string) string {
	if message == "" {
		return ""
	}
	m.mu.Lock()
	defer m.mu.Unlock()
	now := time.Now()
	lost := m.Least > 0 && now.Sub(m.last) < m.Least || m.Most > 0 && len(message) > m.Most
	m.last = now
	m.got = append(m.got, message)
	if lost || m.Deaf != nil && m.Deaf(message) {
		return ""
	}
	if reply, ok := m.Instead[message]; ok {
		return reply + m.End
	}
	for _, r := range m.rules {
		if parts := r.pattern.FindStringSubmatch(message); parts != nil {
			if reply := r.do(parts); reply != "" {
				return reply + m.End
			}
			return ""
		}
	}
	if m.unknown != nil {
		m.unknown(message)
	}
	return ""
}

// queue is an error queue in one of the makers' spellings.
type queue struct {
	none    string
	entries []string
}

func (q *queue) next([]string) string {
	if len(q.entries) == 0 {
		return q.none
	}
	e := q.entries[0]
	q.entries = q.entries[1:]
	return e
}

func (q *queue) push(entry string) { q.entries = append(q.entries, entry) }
