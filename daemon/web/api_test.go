package web

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/http/httptest"
	"reflect"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/danielgtaylor/huma/v2"
	"github.com/google/go-cmp/cmp"

	"nightbench/daemon/store"
	"nightbench/instruments"
	"nightbench/sweeps"
)

func (h *house) dialSocket(ctx context.Context, _, _ string) (net.Conn, error) {
	return (&net.Dialer{}).DialContext(ctx, "unix", h.socket)
}

func TestReadCalls(t *testing.T) {
	h := newHouse(t)
	run := h.newRun()
	wave := sweeps.Record{Node: "timer_out less common", Channel: 1, Interval: 1e-6, VoltsPerCode: 4e-4, Codes: []int16{-1, 0, 32767}}
	h.append(sweeps.Entry{Run: run, Kind: sweeps.KindPoint, Point: point(0, wave)})
	h.append(sweeps.Entry{Run: run, Kind: sweeps.KindPoint, Point: point(1)})

	st := into[Status](h, h.ask("GET", "/api/status", "", operator))
	if st.Version != "v0.1.0" || !st.Practice || st.Pace != 20 || st.Bench != "Bench 2" || !st.MayControl || len(st.Cautions) != 1 || st.StartedAt.IsZero() || st.Vitals.Energised != sweeps.EnergisedNo {
		t.Errorf("status %+v", st)
	}
	if into[Status](h, h.ask("GET", "/api/status", "", nil)).MayControl {
		t.Error("a watcher was told it may control")
	}
	if rs := into[Runs](h, h.ask("GET", "/api/runs", "", nil)).Runs; len(rs) != 1 || rs[0].Measured != 2 || rs[0].Files != nil {
		t.Errorf("runs %+v", rs)
	}
	if d := into[RunDetail](h, h.ask("GET", "/api/runs/1", "", nil)); len(d.Run.Files) != 1 || len(d.Setpoints) != 1 || len(d.Curves) != 1 {
		t.Errorf("run %+v", d)
	}
	want, err := h.store.Points(t.Context(), run)
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(want, into[Points](h, h.ask("GET", "/api/runs/1/points", "", nil)).Points); d != "" {
		t.Error(d)
	}
	if d := cmp.Diff(want[1:], into[Points](h, h.ask("GET", "/api/runs/1/points?after=0", "", nil)).Points); d != "" {
		t.Error(d)
	}
	if l := into[Log](h, h.ask("GET", "/api/runs/1/log", "", nil)).Entries; len(l) != 1 || l[0].Kind != sweeps.KindStarted || l[0].Curves != nil {
		t.Errorf("log %+v", l)
	}
	for _, query := range []string{"", "?point=0"} {
		if w := into[Waveforms](h, h.ask("GET", "/api/runs/1/record"+query, "", nil)); w.Point != 0 || cmp.Diff([]sweeps.Record{wave}, w.Records) != "" || !w.At.Equal(want[0].At) {
			t.Errorf("record%s %+v", query, w)
		}
	}
	if b := into[Bench](h, h.ask("GET", "/api/bench", "", nil)); b.Wiring.Bench != "Bench 2" || len(b.Instruments) != 1 {
		t.Errorf("bench %+v", b)
	}
}

// TestAnswersKeepTheDescription checks every answer, empty and full, against the schema that the page's types are made from.
func TestAnswersKeepTheDescription(t *testing.T) {
	api, _ := description(t)
	for _, full := range []bool{false, true} {
		h := newHouse(t)
		run := h.newRun()
		if full {
			h.append(sweeps.Entry{Run: run, Kind: sweeps.KindPoint, Point: point(0, sweeps.Record{Interval: 1e-6, Codes: []int16{1}})})
			h.append(sweeps.Entry{Run: run, Kind: sweeps.KindOff, Off: &sweeps.Off{Words: "turn S1 by hand"}})
			h.append(sweeps.Entry{Run: run, Kind: sweeps.KindEnded, State: sweeps.Failed})
		}
		for path, item := range api.OpenAPI().Paths {
			if path == streamPath {
				continue
			}
			for method, op := range map[string]*huma.Operation{"GET": item.Get, "POST": item.Post} {
				if op == nil {
					continue
				}
				got := h.ask(method, strings.NewReplacer("{id}", "1", "{hash}", ofBoard).Replace(path), `{"plan":"/p"}`, operator)
				keeps(t, api, op, got, method+" "+path)
			}
		}
	}
}

// keeps validates one answer by the schema its status promises.
func keeps(t *testing.T, api huma.API, op *huma.Operation, got heard, name string) {
	t.Helper()
	promised := op.Responses[fmt.Sprint(got.status)]
	if promised == nil {
		t.Errorf("%s answers %d, which the description does not know: %s", name, got.status, got.body)
		return
	}
	kind := got.header.Get("Content-Type")
	if promised.Content[kind] == nil {
		t.Errorf("%s answers in %s", name, kind)
		return
	}
	valid(t, api, promised.Content[kind].Schema, got.body, name)
}

func valid(t *testing.T, api huma.API, schema *huma.Schema, body, name string) {
	t.Helper()
	var v any
	if err := json.Unmarshal([]byte(body), &v); err != nil {
		t.Errorf("%s: %v", name, err)
		return
	}
	res := &huma.ValidateResult{}
	huma.Validate(api.OpenAPI().Components.Schemas, schema, huma.NewPathBuffer(nil, 0), huma.ModeReadFromServer, v, res)
	for _, e := range res.Errors {
		t.Errorf("%s: %v in %s", name, e, body)
	}
}

func TestNotFound(t *testing.T) {
	h := newHouse(t)
	h.newRun()
	for path, words := range map[string]string{
		"/api/runs/9":                "run 9",
		"/api/runs/9/points":         "run 9",
		"/api/runs/9/log":            "run 9",
		"/api/runs/1/record":         "keep_waveform",
		"/api/runs/1/record?point=3": "has not been measured",
		"/api/gossip":                "no such call",
		"/api/docs":                  "no such call",
	} {
		if got := h.ask("GET", path, "", nil); got.status != http.StatusNotFound || !strings.Contains(got.detail(), words) {
			t.Errorf("%s: %d %s", path, got.status, got.body)
		}
	}
	if got := h.ask("GET", "/api/runs/one", "", nil); got.status != http.StatusUnprocessableEntity {
		t.Errorf("a run that is no number: %d", got.status)
	}
}

func TestCommandsReachTheDaemon(t *testing.T) {
	h := newHouse(t)
	for _, c := range []struct{ path, body, told string }{
		{"/api/runs", `{"plan":"/bench/plan.toml","operator":"J. Moss"}`, "start /bench/plan.toml for J. Moss"},
		{"/api/runs/3/resume", `{"operator":"A. Reed"}`, "resume for A. Reed"},
		{"/api/runs/3/resume", "", "resume for "},
		{"/api/stop", `{"reason":"smell","by":"J. Moss"}`, "stop by J. Moss: smell"},
		{"/api/stop", "", "stop by : "},
		{"/api/hold", `{"by":"J. Moss"}`, "hold by J. Moss"},
		{"/api/continue", "", "continue by "},
		{"/api/off", `{"by":"J. Moss"}`, "off by J. Moss"},
	} {
		h.control.told = nil
		if got := h.ask("POST", c.path, c.body, operator); got.status != http.StatusOK || h.control.said() != c.told {
			t.Errorf("%s %s: %d %s, told %q", c.path, c.body, got.status, got.body, h.control.said())
		}
	}
	if r := into[sweeps.Run](h, h.ask("POST", "/api/runs", `{"plan":"/p"}`, operator)); r.ID != 7 {
		t.Errorf("started %+v", r)
	}
	for _, body := range []string{"", "{}", `{"plan":""}`, `{"plan":"/p","colour":"red"}`, "no json"} {
		h.control.told = nil
		if got := h.ask("POST", "/api/runs", body, operator); got.status/100 != 4 || h.control.said() != "" {
			t.Errorf("start with %q: %d, told %q", body, got.status, h.control.said())
		}
	}
}

// TestOffAlwaysTries: whatever the request looks like, the outputs go off.
func TestOffAlwaysTries(t *testing.T) {
	h := newHouse(t)
	for _, body := range []string{"", "no json", `{"by":7}`, `{"colour":"red"}`, `[]`, strings.Repeat("x", 1<<20)} {
		h.control.told = nil
		got := h.ask("POST", "/api/off", body, func(r *http.Request) {
			operator(r)
			r.Header.Set("Content-Type", "text/odd")
		})
		if got.status != http.StatusOK || h.control.said() != "off by " {
			t.Errorf("body %.20q: %d %.200s, told %q", body, got.status, got.body, h.control.said())
		}
	}
	slow, feed := io.Pipe() // a body that never comes
	defer feed.Close()
	r, _ := http.NewRequest("POST", "http://"+h.addr+"/api/off", slow)
	operator(r)
	h.control.told = nil
	if got := h.send(h.web, r); got.status != http.StatusOK || h.control.said() != "off by " {
		t.Errorf("slow body: %d %s", got.status, got.body)
	}
}

// TestOffOutlivesItsAsker: a page that closes does not call the making safe off.
func TestOffOutlivesItsAsker(t *testing.T) {
	h := newHouse(t)
	h.control.hold = make(chan struct{})
	for _, path := range []string{"/api/off", "/api/stop", "/api/hold"} {
		h.control.told = nil
		ctx, leave := context.WithCancel(t.Context())
		r, _ := http.NewRequestWithContext(ctx, "POST", "http://"+h.addr+path, strings.NewReader("{}"))
		operator(r)
		left := make(chan error, 1)
		go func() {
			resp, err := h.web.Do(r)
			if err == nil {
				resp.Body.Close()
			}
			left <- err
		}()
		for h.control.said() == "" {
			time.Sleep(time.Millisecond)
		}
		leave()
		if err := <-left; !errors.Is(err, context.Canceled) {
			t.Errorf("%s: %v", path, err)
		}
		time.Sleep(10 * time.Millisecond) // the server hears of it
		h.control.mu.Lock()
		if err := h.control.ctx.Err(); err != nil {
			t.Errorf("%s was called off: %v", path, err)
		}
		h.control.mu.Unlock()
	}
	close(h.control.hold)
}

// TestKindsBecomeStatuses is the table, whole.
func TestKindsBecomeStatuses(t *testing.T) {
	h := newHouse(t)
	cases := map[string]struct {
		err  error
		want int
	}{
		"bad file":      {Fail(Invalid, errors.New("plan.toml:3: points = 0")), 422},
		"run open":      {Fail(Conflict, errors.New("run 3 is open")), 409},
		"store: open":   {fmt.Errorf("start: %w", store.ErrRunOpen), 409},
		"store: none":   {fmt.Errorf("run 9: %w", store.ErrNotFound), 404},
		"store: full":   {store.ErrFull, 507},
		"store: closed": {store.ErrClosed, 503},
		"forbidden":     {Fail(Forbidden, errors.New("not you")), 403},
		"cable":         {fmt.Errorf("start: %w", Fail(Trouble, errCable)), 502},
		"ending":        {Fail(Unavailable, errors.New("the daemon is ending")), 503},
		"too late":      {context.DeadlineExceeded, 503},
		"unknown":       {errCable, 500},
	}
	for name, c := range cases {
		h.control.err = c.err
		if got := h.ask("POST", "/api/hold", "{}", operator); got.status != c.want || got.detail() != c.err.Error() {
			t.Errorf("%s: %d %s, want %d", name, got.status, got.body, c.want)
		}
	}
	if len(statuses) != 8 {
		t.Errorf("%d kinds", len(statuses))
	}
	if Fail(Trouble, nil) != nil {
		t.Error("no error became one")
	}
	if !errors.Is(Fail(Trouble, errCable), errCable) {
		t.Error("the cause is lost")
	}
}

// TestWordsAreWhole: every constant of the nouns stands in its schema, found by asking for its type.
func TestWordsAreWhole(t *testing.T) {
	r := newRegistry()
	s := r.Schema(reflect.TypeFor[sweeps.Quantity](), true, "")
	if len(s.Enum) != len(sweeps.Quantities) {
		t.Errorf("%d quantities of %d", len(s.Enum), len(sweeps.Quantities))
	}
	for _, state := range []sweeps.State{sweeps.Preparing, sweeps.Interrupted} {
		if e := r.Schema(reflect.TypeFor[sweeps.State](), true, "").Enum; !slices.Contains(e, any(string(state))) {
			t.Errorf("%s not in %v", state, e)
		}
	}
}

// deadlined records the bound on reading that a handler leaves on its connection.
type deadlined struct {
	*httptest.ResponseRecorder
	left time.Time
}

func (d *deadlined) SetReadDeadline(t time.Time) error { d.left = t; return nil }

// TestLongCommandIsNotCalledOff: a bound on reading a request that passes while
// the daemon still works ends the request's context (net/http reads on in the
// background), so no command may leave one.
func TestLongCommandIsNotCalledOff(t *testing.T) {
	s := New(Options{Control: &control{}, Practice: &fake{}, Clock: instruments.NewClock(1)})
	for _, c := range calls(t) {
		if c.method != http.MethodPost {
			continue
		}
		w := &deadlined{httptest.NewRecorder(), time.Now().Add(readLimit)}
		r := httptest.NewRequest(c.method, c.path, strings.NewReader(c.body))
		s.ServeHTTP(w, r.WithContext(context.WithValue(t.Context(), peerKey{}, true)))
		if w.Code != http.StatusOK || !w.left.IsZero() {
			t.Errorf("%s: %d, reading ends in %v", c.path, w.Code, time.Until(w.left))
		}
	}
}
