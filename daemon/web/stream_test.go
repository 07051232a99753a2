package web

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"math/rand/v2"
	"net/http"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/gorilla/websocket"

	"nightbench/sweeps"
)

// watcher is a page's end of the stream.
type watcher struct {
	*house
	conn *websocket.Conn
}

// message is any of the stream's.
type message struct {
	Kind   string
	Entry  sweeps.Entry
	Vitals sweeps.Vitals
	Seq    int64
	raw    string
}

// watch opens the stream and says hello.
func (h *house) watch(after int64) *watcher {
	h.Helper()
	conn, _, err := websocket.DefaultDialer.Dial(fmt.Sprintf("ws://%s%s?after=%d", h.addr, streamPath, after), nil)
	if err != nil {
		h.Fatal(err)
	}
	h.Cleanup(func() { conn.Close() })
	if err := conn.WriteJSON(Hello{}); err != nil {
		h.Fatal(err)
	}
	return &watcher{h, conn}
}

// hear is the next message of whatever kind.
func (w *watcher) hear() (m message, err error) {
	w.conn.SetReadDeadline(time.Now().Add(10 * time.Second))
	_, text, err := w.conn.ReadMessage()
	if err != nil {
		return m, err
	}
	m.raw = string(text)
	return m, json.Unmarshal(text, &m)
}

// next is the next message but for vitals.
func (w *watcher) next() message {
	w.Helper()
	for {
		m, err := w.hear()
		if err != nil {
			w.Fatal(err)
		}
		if m.Kind != "vitals" {
			return m
		}
	}
}

// expect hears entries from to to, each once and in order.
func (w *watcher) expect(from, to int64) {
	w.Helper()
	for seq := from; seq <= to; seq++ {
		if m := w.next(); m.Kind != "entry" || m.Entry.Seq != seq {
			w.Fatalf("heard %.200s, want entry %d", m.raw, seq)
		}
	}
}

func (w *watcher) expectCaughtUp(seq int64) {
	w.Helper()
	if m := w.next(); m.Kind != "caught_up" || m.Seq != seq {
		w.Fatalf("heard %.200s, want caught_up %d", m.raw, seq)
	}
}

// closing is the code the server hangs up with.
func (w *watcher) closing() int {
	w.Helper()
	for {
		_, err := w.hear()
		var c *websocket.CloseError
		switch {
		case err == nil:
		case errors.As(err, &c):
			return c.Code
		default:
			w.Fatal(err)
		}
	}
}

func TestReplayThenLive(t *testing.T) {
	h := newHouse(t)
	run := h.newRun()
	for i := range 150 { // more than a page
		h.append(sweeps.Entry{Run: run, Kind: sweeps.KindPoint, Point: point(i)})
	}
	w := h.watch(0)
	first, err := w.hear()
	if err != nil || first.Kind != "vitals" || first.Vitals.Watchers != 1 {
		t.Fatalf("first heard %+v, %v; want vitals", first, err)
	}
	w.expect(1, 151)
	w.expectCaughtUp(151)
	h.append(sweeps.Entry{Run: run, Kind: sweeps.KindPoint, Point: point(150)})
	m := w.next()
	if m.Entry.Seq != 152 || m.Entry.Point == nil || m.Entry.Point.Setpoint.Index != 150 || len(m.Entry.Point.Readings) != 1 {
		t.Errorf("live: %s", m.raw)
	}
}

// TestReconnectingLosesNothing: a watcher that is cut off again and again, at any
// moment, and comes back after the last seq it heard, has heard every entry once.
func TestReconnectingLosesNothing(t *testing.T) {
	const entries = 300
	h := newHouse(t)
	run := h.newRun()
	var writer sync.WaitGroup
	writer.Go(func() {
		for i := range entries {
			h.append(sweeps.Entry{Run: run, Kind: sweeps.KindPoint, Point: point(i)})
		}
	})
	defer writer.Wait()
	dice := rand.New(rand.NewPCG(1, 2))
	last, visits := int64(0), 0
	for ; last < entries+1; visits++ {
		w := h.watch(last)
		for n := 1 + dice.IntN(40); n > 0 && last < entries+1; n-- {
			m := w.next()
			if m.Kind == "caught_up" {
				continue
			}
			if m.Entry.Seq != last+1 {
				t.Fatalf("entry %d follows %d", m.Entry.Seq, last)
			}
			last = m.Entry.Seq
		}
		w.conn.Close() // without a goodbye
	}
	if visits < 5 {
		t.Errorf("only %d visits: nothing was proven", visits)
	}
}

// bigEntries are more than a socket holds whose reader takes nothing (about
// 4 MB, nearly all at the sender: Linux's default tcp_wmem), in pieces of 100 kB.
const bigEntries = 80

func (h *house) appendBig() {
	h.Helper()
	words := strings.Repeat("w", 100_000)
	for range bigEntries {
		h.append(sweeps.Entry{Kind: sweeps.KindLog, Words: words})
	}
}

// expectBig hears the big entries without decoding them, and counts the vitals between.
func (w *watcher) expectBig() (vitals int) {
	w.Helper()
	for seq := 1; seq <= bigEntries; {
		w.conn.SetReadDeadline(time.Now().Add(10 * time.Second))
		_, text, err := w.conn.ReadMessage()
		if err != nil {
			w.Fatal(err)
		}
		switch {
		case bytes.HasPrefix(text, []byte(`{"kind":"vitals"`)):
			vitals++
		case bytes.HasPrefix(text, fmt.Appendf(nil, `{"kind":"entry","entry":{"seq":%d,`, seq)):
			seq++
		default:
			w.Fatalf("heard %.200s, want entry %d", text, seq)
		}
	}
	return vitals
}

// TestSlowWatcherHoldsUpNobody: one watcher takes nothing while 8 MB go by; the
// journal and the other watcher go on, and the slow one still gets every entry in
// order when it reads on, but of the vitals it slept through only the newest.
func TestSlowWatcherHoldsUpNobody(t *testing.T) {
	h := newHouse(t)
	slow, fast := h.watch(0), h.watch(0)
	slow.expectCaughtUp(0)
	fast.expectCaughtUp(0)
	h.appendBig()
	fast.expectBig()
	time.Sleep(3 * vitalsEvery)
	begin := time.Now()
	if n, most := slow.expectBig(), 2+int(time.Since(begin)/vitalsEvery); n > most {
		t.Errorf("%d vitals, want at most %d", n, most)
	}
}

func TestFromTheNewestRun(t *testing.T) {
	h := newHouse(t)
	w := h.watch(-1) // an empty journal
	w.expectCaughtUp(0)
	first := h.newRun()
	w.expect(1, 1)
	h.append(sweeps.Entry{Run: first, Kind: sweeps.KindEnded, State: sweeps.Done})
	h.append(sweeps.Entry{Kind: sweeps.KindLog, Words: "between the runs"})
	second := h.newRun()
	h.append(sweeps.Entry{Run: second, Kind: sweeps.KindPoint, Point: point(0)})
	w = h.watch(-1)
	m := w.next()
	if m.Entry.Seq != 4 || m.Entry.Run != second || m.Entry.Kind != sweeps.KindStarted || len(m.Entry.Curves) != 1 || len(m.Entry.Setpoints) != 1 {
		t.Fatalf("heard %s, want the start of run %d", m.raw, second)
	}
	w.expect(5, 5)
	w.expectCaughtUp(5)
}

// A page that was open on another journal comes with a cursor this one has not reached:
// it gets the newest run, whose seqs and caught_up tell it so, and not silence.
func TestCursorOfAnotherJournal(t *testing.T) {
	h := newHouse(t)
	w := h.watch(5000)
	w.expectCaughtUp(0)
	first := h.newRun()
	w.expect(1, 1)
	h.append(sweeps.Entry{Run: first, Kind: sweeps.KindEnded, State: sweeps.Done})
	second := h.newRun()
	h.append(sweeps.Entry{Run: second, Kind: sweeps.KindPoint, Point: point(0)})
	w = h.watch(5)
	w.expect(3, 4)
	w.expectCaughtUp(4)
	w = h.watch(4) // the tail itself is no other journal's
	w.expectCaughtUp(4)
}

// TestVitalsAtMostTwiceASecond: three of them, the first at once, take a second; each is newer.
func TestVitalsAtMostTwiceASecond(t *testing.T) {
	h := newHouse(t)
	begin := time.Now()
	w := h.watch(0)
	var last time.Time
	for n := 0; n < 3; {
		m, err := w.hear()
		if err != nil {
			t.Fatal(err)
		}
		if m.Kind != "vitals" {
			continue
		}
		n++
		if !m.Vitals.At.After(last) {
			t.Errorf("vitals of %v after those of %v", m.Vitals.At, last)
		}
		last = m.Vitals.At
	}
	if d := time.Since(begin); d < 2*vitalsEvery {
		t.Errorf("three vitals within %v", d)
	}
}

// TestMessagesKeepTheDescription checks one message of each kind against the schema the page's types are made from.
func TestMessagesKeepTheDescription(t *testing.T) {
	api, _ := description(t)
	schema := api.OpenAPI().Components.Schemas.Map()["StreamMessage"]
	h := newHouse(t)
	run := h.newRun()
	h.append(sweeps.Entry{Run: run, Kind: sweeps.KindPoint, Point: point(0)})
	h.append(sweeps.Entry{Run: run, Kind: sweeps.KindOff, Off: &sweeps.Off{}})
	w := h.watch(0)
	kinds := map[string]int{}
	for kinds["caught_up"] == 0 {
		m, err := w.hear()
		if err != nil {
			t.Fatal(err)
		}
		kinds[m.Kind]++
		valid(t, api, schema, m.raw, m.Kind)
	}
	if kinds["entry"] != 3 || kinds["vitals"] == 0 {
		t.Errorf("heard %v", kinds)
	}
}

func TestHelloFirst(t *testing.T) {
	h := newHouse(t, func(s *Server) { s.patience = 200 * time.Millisecond })
	h.append(sweeps.Entry{Kind: sweeps.KindLog})
	dial := func() *watcher {
		conn, _, err := websocket.DefaultDialer.Dial("ws://"+h.addr+streamPath, nil)
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(func() { conn.Close() })
		return &watcher{h, conn}
	}
	rude := dial()
	rude.conn.WriteMessage(websocket.TextMessage, []byte("what is going on?"))
	if code := rude.closing(); code != websocket.ClosePolicyViolation {
		t.Errorf("closed with %d", code)
	}
	silent := dial() // nothing is sent before the hello, and patience ends
	if m, err := silent.hear(); err == nil {
		t.Errorf("heard %s before hello", m.raw)
	} else if !websocket.IsCloseError(err, websocket.ClosePolicyViolation) {
		t.Error(err)
	}
}

func TestStreamRefusals(t *testing.T) {
	h := newHouse(t)
	for query, want := range map[string]int{"after=-2": 422, "after=x": 422, "after=9e99": 422, "": 101} {
		_, resp, err := websocket.DefaultDialer.Dial("ws://"+h.addr+streamPath+"?"+query, nil)
		if resp == nil || resp.StatusCode != want {
			t.Errorf("%s: %v %v, want %d", query, resp, err, want)
		}
	}
	_, resp, _ := websocket.DefaultDialer.Dial("ws://"+h.addr+streamPath, http.Header{"Origin": {"http://shop.example"}})
	if resp == nil || resp.StatusCode != http.StatusForbidden {
		t.Errorf("a foreign page watches: %v", resp)
	}
	_, resp, err := websocket.DefaultDialer.Dial("ws://"+h.addr+streamPath, http.Header{"Origin": {"http://" + h.addr}})
	if err != nil {
		t.Errorf("our own page may not: %v %v", resp, err)
	}
}

func TestWatchersAreCounted(t *testing.T) {
	h := newHouse(t)
	count := func() int { return into[Status](h, h.ask("GET", "/api/status", "", nil)).Vitals.Watchers }
	a, b := h.watch(0), h.watch(0)
	a.expectCaughtUp(0)
	b.expectCaughtUp(0)
	if n := count(); n != 2 {
		t.Errorf("%d watchers", n)
	}
	a.conn.Close()
	b.conn.WriteControl(websocket.CloseMessage, websocket.FormatCloseMessage(websocket.CloseNormalClosure, ""), time.Now().Add(time.Second))
	b.closing()
	for end := time.Now().Add(5 * time.Second); count() != 0; time.Sleep(5 * time.Millisecond) {
		if time.Now().After(end) {
			t.Fatalf("%d watchers after all left", count())
		}
	}
}

func TestJournalGone(t *testing.T) {
	h := newHouse(t)
	w := h.watch(0)
	w.expectCaughtUp(0)
	h.store.Close(t.Context())
	if code := w.closing(); code != websocket.CloseInternalServerErr {
		t.Errorf("closed with %d", code)
	}
}
