package web

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"net/http"
	"time"

	"github.com/gorilla/websocket"
)

// The line's own times, wall time.
const (
	writeLimit = 10 * time.Second // for one message to leave; then the watcher counts as gone
	pingEvery  = 15 * time.Second
	silence    = 3 * pingEvery // without even an answer to a ping
	helloLimit = 5 * time.Second
	farewell   = time.Second // for the goodbye
	maxHello   = 4096        // bytes; a watcher has nothing long to say
)

// socket is one websocket: messages out, a hello in. It is the only place that
// knows the websocket library. One goroutine sends; hangUp may come from any.
type socket struct{ conn *websocket.Conn }

// The guard has checked host and origin already, by rules of ours.
var upgrader = websocket.Upgrader{HandshakeTimeout: helloLimit, CheckOrigin: func(*http.Request) bool { return true }}

// openSocket takes a request over; on failure it has answered already.
func openSocket(w http.ResponseWriter, r *http.Request) (*socket, error) {
	conn, err := upgrader.Upgrade(w, r, nil)
	if err != nil {
		return nil, err
	}
	conn.SetReadLimit(maxHello)
	return &socket{conn}, nil
}

// hello waits for the watcher's first message, no longer than limit.
func (s *socket) hello(limit time.Duration) (h Hello, err error) {
	if err := s.conn.SetReadDeadline(time.Now().Add(limit)); err != nil {
		return h, err
	}
	_, text, err := s.conn.ReadMessage()
	if err != nil {
		return h, err
	}
	return h, json.Unmarshal(text, &h)
}

// drain reads on, so that pongs and a goodbye are heard, and returns when the line is gone.
func (s *socket) drain() {
	alive := func(string) error { return s.conn.SetReadDeadline(time.Now().Add(silence)) }
	s.conn.SetPongHandler(alive)
	for err := alive(""); err == nil; {
		_, _, err = s.conn.ReadMessage()
	}
}

// errGone says that a watcher has left or takes nothing any more: no fault of ours.
var errGone = errors.New("the watcher is gone")

// send writes one message, or fails with errGone within writeLimit.
func (s *socket) send(message any) error {
	if err := s.conn.SetWriteDeadline(time.Now().Add(writeLimit)); err != nil {
		return fmt.Errorf("%w: %w", errGone, err)
	}
	if err := s.conn.WriteJSON(message); err != nil {
		return fmt.Errorf("%w: %w", errGone, err)
	}
	return nil
}

// ping asks for a sign of life.
func (s *socket) ping() error {
	if err := s.conn.WriteControl(websocket.PingMessage, nil, time.Now().Add(writeLimit)); err != nil {
		return fmt.Errorf("%w: %w", errGone, err)
	}
	return nil
}

// Reasons to hang up (RFC 6455, 7.4.1).
const (
	goingAway   = websocket.CloseGoingAway
	notWelcome  = websocket.ClosePolicyViolation
	journalGone = websocket.CloseInternalServerErr
)

// hangUp says goodbye, waiting at most farewell for a send under way, and closes the line.
func (s *socket) hangUp(code int, words string) {
	s.conn.WriteControl(websocket.CloseMessage, websocket.FormatCloseMessage(code, words), time.Now().Add(farewell)) // courtesy: the line may be dead
	s.conn.Close()
}

// hangUpWhen hangs up when ctx ends, which also ends a send or a read under way.
func (s *socket) hangUpWhen(ctx context.Context) {
	<-ctx.Done()
	s.hangUp(goingAway, "goodbye")
}
