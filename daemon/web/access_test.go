package web

import (
	"net"
	"net/http"
	"os"
	"slices"
	"strings"
	"testing"

	"nightbench/sweeps"
)

// who makes a request: what it changes, and whether it may watch and control.
type who struct {
	change       func(h *house, r *http.Request)
	let, control bool
}

var callers = map[string]who{
	"watcher":              {func(*house, *http.Request) {}, true, false},
	"operator":             {func(_ *house, r *http.Request) { operator(r) }, true, true},
	"operator by name":     {func(h *house, r *http.Request) { r.Host = "localhost:" + h.port(); operator(r) }, true, true},
	"own page":             {func(h *house, r *http.Request) { r.Header.Set("Origin", "http://"+h.addr); operator(r) }, true, true},
	"another token":        {func(_ *house, r *http.Request) { r.Header.Set("Authorization", "Bearer "+token+"x") }, true, false},
	"no scheme":            {func(_ *house, r *http.Request) { r.Header.Set("Authorization", token) }, true, false},
	"token in a cookie":    {func(_ *house, r *http.Request) { r.AddCookie(&http.Cookie{Name: "token", Value: token}) }, true, false},
	"token in the query":   {func(_ *house, r *http.Request) { r.URL.RawQuery = "token=" + token }, true, false},
	"foreign host":         {func(h *house, r *http.Request) { r.Host = "bench.example:" + h.port(); operator(r) }, false, false},
	"host like loopback":   {func(h *house, r *http.Request) { r.Host = "127.0.0.1.example:" + h.port(); operator(r) }, false, false},
	"another port":         {func(_ *house, r *http.Request) { r.Host = "127.0.0.1:1"; operator(r) }, false, false},
	"host without a port":  {func(_ *house, r *http.Request) { r.Host = "localhost"; operator(r) }, false, false},
	"foreign origin":       {func(_ *house, r *http.Request) { r.Header.Set("Origin", "http://shop.example"); operator(r) }, false, false},
	"origin of a sandbox":  {func(_ *house, r *http.Request) { r.Header.Set("Origin", "null"); operator(r) }, false, false},
	"origin, other port":   {func(_ *house, r *http.Request) { r.Header.Set("Origin", "http://127.0.0.1:1"); operator(r) }, false, false},
	"origin, other scheme": {func(h *house, r *http.Request) { r.Header.Set("Origin", "https://"+h.addr); operator(r) }, false, false},
	"two origins":          {func(h *house, r *http.Request) { r.Header["Origin"] = []string{"http://" + h.addr, "http://x.example"} }, false, false},
}

func (h *house) port() string {
	_, port, _ := net.SplitHostPort(h.addr)
	return port
}

// call is one route with a body that is right.
type call struct{ method, path, body string }

// calls are every route of the description, filled in, and the page's.
func calls(t *testing.T) (all []call) {
	api, _ := description(t)
	bodies := map[string]string{"/api/runs": `{"plan":"/bench/plan.toml"}`, "/api/practice/fault": `{"kind":"silence"}`, "/api/practice/lift": `{"kind":"silence"}`}
	for path, item := range api.OpenAPI().Paths {
		filled := strings.NewReplacer("{id}", "1", "{hash}", ofBoard).Replace(path)
		if item.Get != nil {
			all = append(all, call{http.MethodGet, filled, ""})
		}
		if item.Post != nil {
			body := bodies[path]
			if body == "" {
				body = "{}"
			}
			all = append(all, call{http.MethodPost, filled, body})
		}
	}
	for _, p := range []string{"/", "/runs", "/runs/1", "/bench", "/boards", "/boards/" + ofBoard, "/assets/leaf-1a2b.js", "/icon.svg"} {
		all = append(all, call{http.MethodGet, p, ""})
	}
	return all
}

// TestAccess asks every route as every caller: commands need the operator,
// watching needs only to be let in, and the foreign are turned away everywhere.
func TestAccess(t *testing.T) {
	h := newHouse(t)
	h.newRun()
	h.append(sweeps.Entry{Run: 1, Kind: sweeps.KindPoint, Point: point(0, sweeps.Record{Interval: 1e-6, Codes: []int16{1}})})
	all := calls(t)
	if n := len(all); n < 20 {
		t.Fatalf("%d calls: the description has lost some", n)
	}
	for name, c := range callers {
		for _, a := range all {
			got := h.ask(a.method, a.path, a.body, func(r *http.Request) { c.change(h, r) })
			want := http.StatusOK
			switch {
			case !c.let, a.method == http.MethodPost && !c.control:
				want = http.StatusForbidden
			case a.path == streamPath:
				want = http.StatusBadRequest // let in, but no websocket
			}
			if got.status != want {
				t.Errorf("%s: %s %s gives %d, want %d: %s", name, a.method, a.path, got.status, want, got.body)
			}
			if want == http.StatusForbidden && got.detail() == "" {
				t.Errorf("%s: %s %s is turned away without a word", name, a.method, a.path)
			}
			for k, v := range headers {
				if got.header.Get(k) != v {
					t.Errorf("%s: %s %s: header %s is %q", name, a.method, a.path, k, got.header.Get(k))
				}
			}
		}
	}
}

// TestNobodyControlsByAccident: nothing was commanded by those who may not.
func TestNobodyControlsByAccident(t *testing.T) {
	h := newHouse(t)
	for name, c := range callers {
		if c.control {
			continue
		}
		for _, a := range calls(t) {
			if a.method == http.MethodPost {
				h.ask(a.method, a.path, a.body, func(r *http.Request) { c.change(h, r) })
			}
		}
		if said := h.control.said(); said != "" {
			t.Errorf("%s commanded: %s", name, said)
		}
	}
}

func TestNoTokenNoControl(t *testing.T) {
	s := &Server{}
	r, _ := http.NewRequest(http.MethodPost, "/api/off", nil)
	r.Header.Set("Authorization", "Bearer ")
	if s.holdsToken(r) {
		t.Error("an empty token matched an empty one")
	}
}

// TestPolicy: scripts and styles of our own only, nobody frames the page, and
// nothing inline runs (CSP level 3: 'unsafe-inline' would have to be named).
func TestPolicy(t *testing.T) {
	h := newHouse(t)
	got := strings.Split(h.ask("GET", "/", "", nil).header.Get("Content-Security-Policy"), "; ")
	for _, want := range []string{"default-src 'none'", "script-src 'self'", "style-src 'self'", "connect-src 'self' ws://" + h.addr, "frame-ancestors 'none'", "base-uri 'none'", "form-action 'none'"} {
		if !slices.Contains(got, want) {
			t.Errorf("missing %s in %v", want, got)
		}
	}
	if all := strings.Join(got, " "); strings.Contains(all, "unsafe") || strings.Contains(all, "*") || strings.Contains(all, "https:") {
		t.Errorf("too open: %s", all)
	}
	if c := h.ask("GET", "/api/status", "", nil).header.Get("Cache-Control"); c != "no-store" {
		t.Errorf("answers may be kept: %q", c)
	}
}

func TestSocketPeerMayControl(t *testing.T) {
	h := newHouse(t)
	if i, err := os.Stat(h.socket); err != nil || i.Mode().Perm() != 0o600 {
		t.Fatalf("%v %v", i, err)
	}
	web := &http.Client{Transport: &http.Transport{DialContext: h.dialSocket}}
	defer web.CloseIdleConnections()
	ask := func(origin string) heard {
		r, _ := http.NewRequest(http.MethodPost, "http://localhost/api/off", strings.NewReader(`{"by":"J. Moss"}`))
		if origin != "" {
			r.Header.Set("Origin", origin)
		}
		return h.send(web, r)
	}
	if off := into[sweeps.Off](h, ask("")); !off.Confirmed || h.control.said() != "off by J. Moss" {
		t.Errorf("%+v, told %q", off, h.control.said())
	}
	if got := ask("http://shop.example"); got.status != http.StatusForbidden {
		t.Errorf("a foreign page over the socket: %d", got.status)
	}
}
