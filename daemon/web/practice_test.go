package web

import (
	"errors"
	"net/http"
	"strings"
	"sync"
	"testing"
)

// fake is a practice bench that knows one fault.
type fake struct {
	mu sync.Mutex
	in []PracticeFault
}

func (f *fake) Faults() PracticeFaults {
	f.mu.Lock()
	defer f.mu.Unlock()
	return PracticeFaults{Kinds: []PracticeKind{{Kind: "silence", Words: "gives no reply", On: []string{"supply"}}}, InForce: f.in}
}

func (f *fake) Inject(x PracticeFault) error {
	if x.Kind != "silence" {
		return Fail(Invalid, errors.New("no fault "+x.Kind))
	}
	f.mu.Lock()
	defer f.mu.Unlock()
	f.in = append(f.in, x)
	return nil
}

func (f *fake) Lift(kind, _ string) bool {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.in = nil
	return kind == "silence"
}

func TestFaultsOfAPracticeBench(t *testing.T) {
	h := newHouse(t)
	for _, c := range []struct {
		path, body string
		status     int
		words      string
	}{
		{"/api/practice/fault", `{"kind":"silence","on":"supply","times":2}`, http.StatusOK, `"in_force":[{"kind":"silence","on":"supply","times":2}]`},
		{"/api/practice/fault", `{"kind":"gremlin"}`, http.StatusUnprocessableEntity, "no fault gremlin"},
		{"/api/practice/lift", `{"kind":"silence"}`, http.StatusOK, `"in_force":[]`},
		{"/api/practice/lift", `{"kind":"echo"}`, http.StatusNotFound, "no such fault"},
	} {
		a := h.ask(http.MethodPost, c.path, c.body, commanding)
		if a.status != c.status || !strings.Contains(a.body, c.words) {
			t.Errorf("%s %s: %d %s, expected %d with %q", c.path, c.body, a.status, a.body, c.status, c.words)
		}
	}
	watching := func(r *http.Request) { r.Header.Set("Content-Type", "application/json") }
	if a := h.ask(http.MethodPost, "/api/practice/fault", `{"kind":"silence"}`, watching); a.status != http.StatusForbidden {
		t.Errorf("a watcher brings a fault about: %d", a.status)
	}
	if seen := into[PracticeFaults](h, h.ask(http.MethodGet, "/api/practice", "", nil)); len(seen.Kinds) != 1 || len(seen.InForce) != 0 {
		t.Errorf("a watcher sees %+v", seen)
	}
}

func TestNoFaultsOnAnotherBench(t *testing.T) {
	h := newHouse(t, func(s *Server) { s.o.Practice = nil })
	if none := into[PracticeFaults](h, h.ask(http.MethodGet, "/api/practice", "", nil)); len(none.Kinds) != 0 || len(none.InForce) != 0 {
		t.Errorf("nothing can go wrong on purpose, and it says %+v", none)
	}
	a := h.ask(http.MethodPost, "/api/practice/fault", `{"kind":"silence"}`, commanding)
	if a.status != http.StatusConflict || !strings.Contains(a.detail(), "this bench is not one") {
		t.Errorf("%d %s", a.status, a.body)
	}
}

func commanding(r *http.Request) {
	operator(r)
	r.Header.Set("Content-Type", "application/json")
}
