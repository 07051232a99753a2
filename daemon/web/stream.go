package web

import (
	"context"
	"errors"
	"fmt"
	"net/http"
	"strconv"
	"sync"
	"time"

	"nightbench/daemon/store"
)

const (
	streamPath    = "/api/stream"
	fromNewestRun = -1
	pageSize      = 100                    // entries a read: about 200 kB of points
	vitalsEvery   = 500 * time.Millisecond // at most 2 Hz; also the sign of life a browser can see
)

// stream upgrades a request and feeds its watcher until one of them goes.
func (s *Server) stream(w http.ResponseWriter, r *http.Request) {
	after, err := cursorOf(r)
	if err != nil {
		answerProblem(w, Invalid, err.Error())
		return
	}
	if !s.enter() {
		answerProblem(w, Unavailable, "the daemon is ending; try again when it is back")
		return
	}
	defer s.leave()
	sock, err := openSocket(w, r)
	if err != nil {
		return // answered by the upgrade
	}
	ctx, cancel := context.WithCancel(s.life)
	var all sync.WaitGroup
	defer all.Wait()
	defer cancel()
	all.Go(func() { sock.hangUpWhen(ctx) })
	if _, err := sock.hello(s.patience); err != nil {
		sock.hangUp(notWelcome, "say hello first: {\"token\":\"\"}")
		return
	}
	all.Go(func() { defer cancel(); sock.drain() })
	if err := s.feed(ctx, sock, after); !errors.Is(err, errGone) && ctx.Err() == nil {
		s.o.Log.Error("stream ended", "err", err)
		sock.hangUp(journalGone, "the journal can't be read")
	}
}

// cursorOf is the query's after; 0 where it is left out.
func cursorOf(r *http.Request) (int64, error) {
	text := r.URL.Query().Get("after")
	if text == "" {
		return 0, nil
	}
	n, err := strconv.ParseInt(text, 10, 64)
	if err != nil || n < fromNewestRun {
		return 0, fmt.Errorf("after=%q: give the seq of the last entry seen, 0 for all, or -1 for the newest run", text)
	}
	return n, nil
}

// feed is the whole of a watcher: a cursor. Read entries after n, send, repeat;
// when there are none, wait for the bell. Vitals go between, only ever the
// newest. A cursor beyond the tail is of another journal: the watcher gets the newest
// run of this one, and knows it by seqs that lie before its own. It returns only with
// an error: errGone, the context's, or the journal's.
func (s *Server) feed(ctx context.Context, sock *socket, after int64) (err error) {
	target, err := s.o.Store.Last(ctx)
	if err != nil {
		return err
	}
	if after == fromNewestRun || after > target {
		if after, err = s.newestRun(ctx); err != nil {
			return err
		}
	}
	v := &vitalsLine{s: s, sock: sock}
	if err := v.now(); err != nil {
		return err
	}
	caught := false
	for {
		entries, err := s.o.Store.Entries(ctx, after, pageSize)
		if err != nil {
			return err
		}
		for _, e := range entries {
			if err := sock.send(EntryMessage{"entry", tidyEntry(e)}); err != nil {
				return err
			}
			after = e.Seq
			if err := v.ifDue(); err != nil {
				return err
			}
		}
		if !caught && after >= target {
			caught = true
			if err := sock.send(CaughtUpMessage{"caught_up", after}); err != nil {
				return err
			}
		}
		if err := s.rest(ctx, v, after); err != nil {
			return err
		}
	}
}

// newestRun is the cursor just before the newest run's first entry; the tail where there is no run.
func (s *Server) newestRun(ctx context.Context) (int64, error) {
	runs, err := s.o.Store.Runs(ctx)
	if err != nil {
		return 0, err
	}
	if len(runs) > 0 {
		seq, err := s.o.Store.RunStart(ctx, runs[0].ID)
		if !errors.Is(err, store.ErrNotFound) { // a run just created may have said nothing yet
			return seq - 1, err
		}
	}
	return s.o.Store.Last(ctx)
}

// rest waits for the bell, sending vitals and pings meanwhile.
func (s *Server) rest(ctx context.Context, v *vitalsLine, after int64) error {
	waiting, stop := context.WithCancel(ctx)
	rung := make(chan error, 1)
	go func() { rung <- s.o.Store.Wait(waiting, after) }()
	gone := func() { stop(); <-rung }
	for {
		select {
		case err := <-rung:
			stop()
			return err
		case <-time.After(v.left()):
		}
		if err := v.ifDue(); err != nil {
			gone()
			return err
		}
	}
}

// vitalsLine keeps the pace of the volatile part of one watcher's stream, and of the pings.
type vitalsLine struct {
	s        *Server
	sock     *socket
	due      time.Time
	pingNext time.Time
}

func (v *vitalsLine) left() time.Duration { return max(0, time.Until(v.due)) }

func (v *vitalsLine) ifDue() error {
	if v.left() > 0 {
		return nil
	}
	return v.now()
}

// now sends the newest vitals, and a ping where one is due.
func (v *vitalsLine) now() error {
	now := time.Now()
	v.due = now.Add(vitalsEvery)
	if now.After(v.pingNext) {
		v.pingNext = now.Add(pingEvery)
		if err := v.sock.ping(); err != nil {
			return err
		}
	}
	return v.sock.send(VitalsMessage{"vitals", v.s.vitals()})
}
