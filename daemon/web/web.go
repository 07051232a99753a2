// Package web serves the bench over HTTP: the API in JSON, the stream over a
// websocket, and the page built into the program. Anyone let in may watch; the
// operator's token, or the socket in the state folder, may control. Watchers
// cost the run nothing: each is a cursor into the journal.
package web

import (
	"context"
	"io/fs"
	"log/slog"
	"net/http"
	"sync"
	"sync/atomic"
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// Tail is the end of the journal, read by every watcher.
type Tail interface {
	// Entries are up to limit entries after a seq, oldest first.
	Entries(ctx context.Context, after int64, limit int) ([]sweeps.Entry, error)
	// Wait returns nil when an entry after a seq exists.
	Wait(ctx context.Context, after int64) error
	Last(ctx context.Context) (int64, error)
	RunStart(ctx context.Context, run int64) (int64, error)
}

// Shelf is the runs and what they hold.
type Shelf interface {
	Runs(ctx context.Context) ([]sweeps.Run, error) // newest first
	Run(ctx context.Context, id int64) (sweeps.Run, error)
	Plan(ctx context.Context, run int64) ([]sweeps.Setpoint, []sweeps.Curve, error)
	Points(ctx context.Context, run int64) ([]sweeps.Point, error)
	Log(ctx context.Context, run int64) ([]sweeps.Entry, error)
	Point(ctx context.Context, run int64, index int) (sweeps.Point, error) // with its waveforms
	NewestRecord(ctx context.Context, run int64) (sweeps.Point, error)     // likewise
}

// Journal is the store as the web reads it.
type Journal interface {
	Tail
	Shelf
}

// Controller is the daemon as the web commands it. Its errors may say their
// kind (see [Kinded]); all may be called at once from several requests.
type Controller interface {
	Vitals() sweeps.Vitals
	Bench() Bench
	// Start and Resume return when the run is open; it goes on by itself.
	Start(ctx context.Context, q StartRequest) (sweeps.Run, error)
	Resume(ctx context.Context, run int64, operator string) (sweeps.Run, error)
	// Stop ends the open run politely and returns when the bench is safe.
	Stop(ctx context.Context, reason, by string) error
	Hold(ctx context.Context, by string) error
	Continue(ctx context.Context, by string) error
	// Off switches the outputs off, with or without a run, and answers what is known then.
	Off(ctx context.Context, by string) (sweeps.Off, error)
}

// Options are what a server needs. All are required but Log and Page.
type Options struct {
	Store    Journal
	Control  Controller
	Predict  Predictor
	Practice Practice // nil: the instruments are real, or simulated by another program
	Page     fs.FS    // index.html at its root; without one a plain page says how to build it
	Token    string   // the operator's; empty: only the socket may control
	Version  string
	Cautions []string // shown on every view, a sentence or two each
	Clock    instruments.Clock
	Log      *slog.Logger
}

// Server is the handler of everything, and the life of its watchers.
type Server struct {
	o       Options
	began   time.Time
	handler http.Handler

	patience time.Duration   // with a watcher who says no hello
	life     context.Context // of the watchers; ended by Close
	end      context.CancelFunc
	mu       sync.Mutex // orders the arrival of watchers before Close
	closed   bool       // under mu
	watching sync.WaitGroup
	watchers atomic.Int64
}

// New makes a server. Close it when done.
func New(o Options) *Server {
	if o.Log == nil {
		o.Log = slog.New(slog.DiscardHandler)
	}
	s := &Server{o: o, began: o.Clock.Now(), patience: helloLimit}
	s.life, s.end = context.WithCancel(context.Background())
	mux := http.NewServeMux()
	s.newAPI(mux)
	mux.HandleFunc("GET "+streamPath, s.stream)
	mux.HandleFunc("/api/", noSuchCall)
	mux.Handle("/", page(o.Page))
	s.handler = s.guard(mux)
	return s
}

// ServeHTTP answers one request.
func (s *Server) ServeHTTP(w http.ResponseWriter, r *http.Request) { s.handler.ServeHTTP(w, r) }

// Close says goodbye to every watcher and waits until all have gone, or ctx
// ends. It may be called twice.
func (s *Server) Close(ctx context.Context) error {
	s.mu.Lock()
	s.closed = true
	s.mu.Unlock()
	s.end()
	gone := make(chan struct{})
	go func() { defer close(gone); s.watching.Wait() }()
	select {
	case <-gone:
		return nil
	case <-ctx.Done():
		return context.Cause(ctx)
	}
}

// enter counts a watcher in; false once the server closes. Every true is followed by leave.
func (s *Server) enter() bool {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.closed {
		return false
	}
	s.watching.Add(1)
	s.watchers.Add(1)
	return true
}

func (s *Server) leave() {
	s.watchers.Add(-1)
	s.watching.Done()
}

// vitals are the controller's, tidied for the wire, with the number of those who watch.
func (s *Server) vitals() sweeps.Vitals {
	v := s.o.Control.Vitals()
	v.Watchers = int(s.watchers.Load())
	if v.Energised == "" {
		v.Energised = sweeps.EnergisedUnconfirmed
	}
	if v.Instruments == nil {
		v.Instruments = []sweeps.Answering{}
	}
	return v
}
