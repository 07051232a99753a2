package web

import (
	"context"
	"errors"
	"io/fs"
	"net"
	"net/http"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/gorilla/websocket"

	"nightbench/instruments"
)

// TestShutdownWithWatchers: at the end each watcher hears goodbye, one that
// takes nothing is cut off, and Serve returns (the house's stop waits for it;
// goleak sees that nothing is left).
func TestShutdownWithWatchers(t *testing.T) {
	h := newHouse(t)
	stuck := h.watch(0)
	h.appendBig()
	a, b := h.watch(bigEntries), h.watch(bigEntries)
	a.expectCaughtUp(bigEntries)
	b.expectCaughtUp(bigEntries)
	silent, _, err := websocket.DefaultDialer.Dial("ws://"+h.addr+streamPath, nil) // not even a hello
	if err != nil {
		t.Fatal(err)
	}
	defer silent.Close()
	h.stop()
	for _, w := range []*watcher{a, b, {h, silent}} {
		if code := w.closing(); code != websocket.CloseGoingAway {
			t.Errorf("closed with %d", code)
		}
	}
	for err == nil { // what was on the way, then the end
		_, err = stuck.hear()
	}
	if _, _, err := websocket.DefaultDialer.Dial("ws://"+h.addr+streamPath, nil); err == nil {
		t.Error("still served")
	}
	if _, err := os.Stat(h.socket); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("the socket's file is left: %v", err)
	}
}

// TestShutdownFinishesAnswers: an answer under way is given before the server ends.
func TestShutdownFinishesAnswers(t *testing.T) {
	h := newHouse(t)
	h.control.hold = make(chan struct{})
	answered := make(chan int, 1)
	go func() {
		answered <- h.ask("POST", "/api/off", "{}", operator).status
	}()
	for h.control.said() == "" {
		time.Sleep(time.Millisecond)
	}
	stopped := make(chan struct{})
	go func() { defer close(stopped); h.stop() }()
	time.Sleep(20 * time.Millisecond)
	close(h.control.hold)
	if got := <-answered; got != http.StatusOK {
		t.Errorf("answered %d", got)
	}
	<-stopped
}

func TestCloseTwiceAndLateWatcher(t *testing.T) {
	h := newHouse(t)
	for range 2 {
		if err := h.server.Close(t.Context()); err != nil {
			t.Fatal(err)
		}
	}
	if _, resp, err := websocket.DefaultDialer.Dial("ws://"+h.addr+streamPath, nil); err == nil || resp.StatusCode != http.StatusServiceUnavailable {
		t.Errorf("a late watcher: %v %v", resp, err)
	}
}

func TestOnlyLoopbackIsServed(t *testing.T) {
	s := New(Options{Clock: instruments.NewClock(1)})
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Serve(t.Context(), everywhere{l}); err == nil || !strings.Contains(err.Error(), "only loopback") {
		t.Errorf("got %v", err)
	}
	if _, err := l.Accept(); !errors.Is(err, net.ErrClosed) {
		t.Errorf("the listener stays open: %v", err)
	}
}

// everywhere says of a listener that all the world can reach it.
type everywhere struct{ net.Listener }

func (everywhere) Addr() net.Addr { return &net.TCPAddr{IP: net.IPv4zero, Port: 80} }

func TestListenerFails(t *testing.T) {
	s := New(Options{Clock: instruments.NewClock(1)})
	good, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	bad, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	bad.Close()
	if err := s.Serve(context.Background(), good, bad); !errors.Is(err, net.ErrClosed) {
		t.Errorf("got %v", err)
	}
}

func TestSocketOfTheDeadIsReplaced(t *testing.T) {
	path := filepath.Join(t.TempDir(), "socket")
	dead, err := net.ListenUnix("unix", &net.UnixAddr{Name: path, Net: "unix"})
	if err != nil {
		t.Fatal(err)
	}
	dead.SetUnlinkOnClose(false)
	dead.Close()
	l, err := ListenSocket(path)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := ListenSocket(path); err == nil || !strings.Contains(err.Error(), "another daemon") {
		t.Errorf("took a living daemon's socket: %v", err)
	}
	if left, _ := filepath.Glob(filepath.Join(filepath.Dir(path), ".s*")); len(left) != 0 {
		t.Errorf("left behind: %v", left)
	}
	if err := l.Close(); err != nil {
		t.Error(err)
	}
	if _, err := ListenSocket(filepath.Join(filepath.Dir(path), strings.Repeat("deep", 30))); err == nil || !strings.Contains(err.Error(), "shorter state folder") {
		t.Errorf("a path too long: %v", err)
	}
}
