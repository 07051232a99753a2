package web

import (
	"context"
	"encoding/json"
	"errors"
	"io"
	"net"
	"net/http"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"testing/fstest"
	"time"

	"go.uber.org/goleak"

	"nightbench/daemon/store"
	"nightbench/instruments"
	"nightbench/sweeps"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

const token = "c2VjcmV0LW9mLXRoZS1vcGVyYXRvcg"

// control is a daemon that notes what it is told. A nil error field means that it does as told.
type control struct {
	mu    sync.Mutex
	told  []string
	ctx   context.Context // of the last command
	err   error
	looks int           // how often vitals were asked for
	hold  chan struct{} // when not nil, commands wait for it
}

func (c *control) note(ctx context.Context, words string) error {
	c.mu.Lock()
	c.told, c.ctx = append(c.told, words), ctx
	hold, err := c.hold, c.err
	c.mu.Unlock()
	if hold != nil {
		<-hold
	}
	return err
}

func (c *control) said() string {
	c.mu.Lock()
	defer c.mu.Unlock()
	return strings.Join(c.told, "; ")
}

func (c *control) Vitals() sweeps.Vitals {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.looks++
	return sweeps.Vitals{At: time.Unix(int64(c.looks), 0).UTC(), Energised: sweeps.EnergisedNo, Doing: "No run is open"}
}

func (c *control) Bench() Bench {
	return Bench{Wiring: instruments.Wiring{Bench: "Bench 2", Practice: true, Scope: &instruments.ScopeWiring{}}, Instruments: []Instrument{{Name: "supply", Role: "supply", Dialect: "standard"}}}
}

func (c *control) Start(ctx context.Context, q StartRequest) (sweeps.Run, error) {
	return sweeps.Run{ID: 7, State: sweeps.Preparing, Plan: q.Plan}, c.note(ctx, "start "+q.Plan+" for "+q.Operator)
}

func (c *control) Resume(ctx context.Context, run int64, operator string) (sweeps.Run, error) {
	return sweeps.Run{ID: run, State: sweeps.Preparing}, c.note(ctx, "resume for "+operator)
}

func (c *control) Stop(ctx context.Context, reason, by string) error {
	return c.note(ctx, "stop by "+by+": "+reason)
}
func (c *control) Hold(ctx context.Context, by string) error { return c.note(ctx, "hold by "+by) }
func (c *control) Continue(ctx context.Context, by string) error {
	return c.note(ctx, "continue by "+by)
}

func (c *control) Off(ctx context.Context, by string) (sweeps.Off, error) {
	return sweeps.Off{Confirmed: true, Below: 0.5, At: time.Unix(0, 0).UTC()}, c.note(ctx, "off by "+by)
}

// house is a server on real listeners over a real store.
type house struct {
	testing.TB
	store   *store.Store
	control *control
	server  *Server
	addr    string // host:port
	socket  string // path
	web     *http.Client
	stop    func() // ends Serve and waits for it
}

func newHouse(t testing.TB, change ...func(*Server)) *house {
	t.Helper()
	dir := t.TempDir()
	st, err := store.Open(t.Context(), filepath.Join(dir, "nightbench.db"), instruments.NewClock(1))
	if err != nil {
		t.Fatal(err)
	}
	h := &house{TB: t, store: st, control: &control{}, socket: filepath.Join(dir, "socket"), web: &http.Client{Transport: &http.Transport{}}}
	h.server = New(Options{
		Store: st, Control: h.control, Predict: drawer{}, Practice: &fake{}, Token: token, Version: "v0.1.0", Cautions: []string{"A software button is no emergency stop."}, Clock: instruments.NewClock(20),
		Page: fstest.MapFS{"index.html": {Data: []byte("<!doctype html><title>leaf</title>")}, "assets/leaf-1a2b.js": {Data: []byte("let leaf")}, "icon.svg": {Data: []byte("<svg/>")}, ".keep": {}},
	})
	for _, c := range change {
		c(h.server)
	}
	tcp, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	unix, err := ListenSocket(h.socket)
	if err != nil {
		t.Fatal(err)
	}
	h.addr = tcp.Addr().String()
	ctx, cancel := context.WithCancel(context.Background())
	served := make(chan error, 1)
	go func() { served <- h.server.Serve(ctx, tcp, unix) }()
	h.stop = sync.OnceFunc(func() {
		cancel()
		if err := <-served; err != nil {
			t.Errorf("serve: %v", err)
		}
	})
	t.Cleanup(func() {
		h.web.CloseIdleConnections()
		h.stop()
		if err := st.Close(context.Background()); err != nil {
			t.Error(err)
		}
	})
	return h
}

// reply is an answer, read whole.
type heard struct {
	status int
	header http.Header
	body   string
}

// ask makes one request; change may be nil.
func (h *house) ask(method, path, body string, change func(*http.Request)) heard {
	h.Helper()
	r, err := http.NewRequestWithContext(h.Context(), method, "http://"+h.addr+path, strings.NewReader(body))
	if err != nil {
		h.Fatal(err)
	}
	if change != nil {
		change(r)
	}
	return h.send(h.web, r)
}

func (h *house) send(c *http.Client, r *http.Request) heard {
	h.Helper()
	resp, err := c.Do(r)
	if err != nil {
		h.Fatal(err)
	}
	defer resp.Body.Close()
	b, err := io.ReadAll(resp.Body)
	if err != nil {
		h.Fatal(err)
	}
	return heard{resp.StatusCode, resp.Header, string(b)}
}

func operator(r *http.Request) { r.Header.Set("Authorization", "Bearer "+token) }

// into decodes an answer of status 200.
func into[T any](h *house, a heard) (v T) {
	h.Helper()
	if a.status != http.StatusOK {
		h.Fatalf("%d %s", a.status, a.body)
	}
	if err := json.Unmarshal([]byte(a.body), &v); err != nil {
		h.Fatal(err)
	}
	return v
}

// detail is the words of a problem.
func (a heard) detail() string {
	var p struct{ Detail string }
	if !strings.HasPrefix(a.header.Get("Content-Type"), "application/problem+json") || json.Unmarshal([]byte(a.body), &p) != nil {
		return "no problem: " + a.body
	}
	return p.Detail
}

// newRun opens a run and announces it.
func (h *house) newRun() int64 {
	h.Helper()
	r, err := h.store.CreateRun(h.Context(), sweeps.Run{Plan: "Overnight", Pace: 20, Planned: 3, Seed: 1, Quantities: []sweeps.Quantity{sweeps.Duty}, Files: []sweeps.File{{Role: "plan", Name: "plan.toml", Text: "[plan]"}}})
	if err != nil {
		h.Fatal(err)
	}
	h.append(sweeps.Entry{Run: r.ID, Kind: sweeps.KindStarted, Words: "run began", Setpoints: []sweeps.Setpoint{{Index: 0, Supply: 9}}, Curves: []sweeps.Curve{{Supply: 9, Pot: []float64{1e3}, Quantities: map[sweeps.Quantity]sweeps.CurveOfQuantity{}}}})
	return r.ID
}

func (h *house) append(e sweeps.Entry) sweeps.Entry {
	h.Helper()
	e, err := h.store.Append(context.Background(), e)
	if err != nil {
		h.Error(err)
	}
	return e
}

func point(index int, waves ...sweeps.Record) *sweeps.Point {
	return &sweeps.Point{Setpoint: sweeps.Setpoint{Index: index, Supply: 9, PotCode: 26, Pot: 10192, Direction: sweeps.Up}, Readings: []sweeps.Reading{sweeps.Measured(sweeps.Duty, 0.45, 1e-3, 4, "scope ch 1")},
		Predictions: map[sweeps.Quantity]sweeps.Prediction{sweeps.Duty: {Value: 0.45, Low: 0.44, High: 0.46, Unit: "1"}}, Records: waves}
}

var errCable = errors.New("supply: no answer within 1 s: is the cable in?")
