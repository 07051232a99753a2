package web

import (
	"context"
	"net/http"

	"github.com/danielgtaylor/huma/v2"
	"github.com/danielgtaylor/huma/v2/adapters/humago"

	"nightbench/sweeps"
)

// newAPI registers every call on a mux and answers their description.
func (s *Server) newAPI(mux *http.ServeMux) huma.API {
	config := huma.DefaultConfig("Nightbench", "1")
	config.Info.Description = "One bench, its runs, and the stream of its journal. Numbers are SI; times are UTC."
	config.OpenAPIPath, config.DocsPath, config.SchemasPath = "", "", "" // nothing that loads from elsewhere; the description is a file of the source
	config.CreateHooks = nil                                             // no $schema links in answers
	config.Components.Schemas = newRegistry()
	config.Components.SecuritySchemes = map[string]*huma.SecurityScheme{
		"operator": {Type: "http", Scheme: "bearer", Description: "The operator's token. The socket in the state folder needs none."},
	}
	api := humago.New(mux, config)
	s.readCalls(api)
	s.boardCalls(api)
	s.controlCalls(api)
	s.practiceCalls(api)
	describeStream(api)
	neverNull(api.OpenAPI().Components.Schemas)
	seedAsText(api.OpenAPI().Components.Schemas)
	return api
}

// answer is a body.
type answer[T any] struct{ Body T }

func reply[T any](v T) *answer[T] { return &answer[T]{v} }

// OfRun is the input of a call about one run.
type OfRun struct {
	ID int64 `path:"id" minimum:"1" doc:"The run's number."`
}

// Inputs of the calls that read.
type (
	none        struct{}
	pointsOfRun struct {
		OfRun
		After int `query:"after" default:"-1" minimum:"-1" doc:"Only points whose setpoint's index is above."`
	}
	recordOfRun struct {
		OfRun
		Point int `query:"point" default:"-1" minimum:"-1" doc:"A setpoint's index; left out: the newest point that kept waveforms."`
	}
)

// get registers a call that anyone let in may make.
func get[I, O any](s *Server, api huma.API, id, path, summary string, do func(context.Context, *I) (O, error)) {
	op := huma.Operation{OperationID: id, Method: http.MethodGet, Path: path, Summary: summary, Errors: []int{403, 404, 503}}
	huma.Register(api, op, func(ctx context.Context, in *I) (*answer[O], error) {
		out, err := do(ctx, in)
		if err != nil {
			return nil, s.problem(err)
		}
		return reply(out), nil
	})
}

func (s *Server) readCalls(api huma.API) {
	get(s, api, "status", "/api/status", "What the bench is doing", s.status)
	get(s, api, "runs", "/api/runs", "All runs, newest first", s.runs)
	get(s, api, "run", "/api/runs/{id}", "One run with its files, order of visit and prediction", s.runDetail)
	get(s, api, "points", "/api/runs/{id}/points", "A run's points in the order measured", s.points)
	get(s, api, "log", "/api/runs/{id}/log", "A run's log, oldest first", s.log)
	get(s, api, "record", "/api/runs/{id}/record", "Raw waveforms kept with a point", s.record)
	get(s, api, "bench", "/api/bench", "The wiring and who answers", s.bench)
}

func (s *Server) status(ctx context.Context, _ *none) (Status, error) {
	wiring := s.o.Control.Bench().Wiring
	return Status{
		Version: s.o.Version, Practice: wiring.Practice, Pace: s.o.Clock.Pace(), Bench: wiring.Bench, MayControl: mayControl(ctx),
		Vitals: s.vitals(), Cautions: orEmpty(s.o.Cautions), StartedAt: s.began,
	}, nil
}

func (s *Server) runs(ctx context.Context, _ *none) (Runs, error) {
	rs, err := s.o.Store.Runs(ctx)
	for i := range rs {
		rs[i] = tidyRun(rs[i])
	}
	return Runs{orEmpty(rs)}, err
}

func (s *Server) runDetail(ctx context.Context, in *OfRun) (RunDetail, error) {
	r, err := s.o.Store.Run(ctx, in.ID)
	if err != nil {
		return RunDetail{}, err
	}
	setpoints, curves, err := s.o.Store.Plan(ctx, in.ID)
	return RunDetail{tidyRun(r), orEmpty(setpoints), orEmpty(curves)}, err
}

func (s *Server) points(ctx context.Context, in *pointsOfRun) (Points, error) {
	if _, err := s.o.Store.Run(ctx, in.ID); err != nil {
		return Points{}, err
	}
	all, err := s.o.Store.Points(ctx, in.ID)
	after := make([]sweeps.Point, 0, len(all))
	for _, p := range all {
		if p.Setpoint.Index > in.After {
			after = append(after, p)
		}
	}
	return Points{after}, err
}

func (s *Server) log(ctx context.Context, in *OfRun) (Log, error) {
	if _, err := s.o.Store.Run(ctx, in.ID); err != nil {
		return Log{}, err
	}
	es, err := s.o.Store.Log(ctx, in.ID)
	for i := range es {
		es[i] = tidyEntry(es[i])
	}
	return Log{orEmpty(es)}, err
}

func (s *Server) record(ctx context.Context, in *recordOfRun) (Waveforms, error) {
	read := func() (sweeps.Point, error) { return s.o.Store.NewestRecord(ctx, in.ID) }
	if in.Point >= 0 {
		read = func() (sweeps.Point, error) { return s.o.Store.Point(ctx, in.ID, in.Point) }
	}
	p, err := read()
	return Waveforms{p.Setpoint.Index, p.At, orEmpty(p.Records)}, err
}

func (s *Server) bench(context.Context, *none) (Bench, error) {
	b := s.o.Control.Bench()
	b.Instruments, b.Wiring.Meters = orEmpty(b.Instruments), orEmpty(b.Wiring.Meters)
	if b.Wiring.Scope != nil {
		scope := *b.Wiring.Scope
		scope.Channels = orEmpty(scope.Channels)
		b.Wiring.Scope = &scope
	}
	return b, nil
}

// orEmpty makes no list an empty one: the API never answers null for a list.
func orEmpty[T any](list []T) []T {
	if list == nil {
		return []T{}
	}
	return list
}

func tidyRun(r sweeps.Run) sweeps.Run {
	r.Quantities = orEmpty(r.Quantities)
	return r
}

func tidyEntry(e sweeps.Entry) sweeps.Entry {
	if e.Off != nil {
		off := *e.Off
		off.By = orEmpty(off.By)
		e.Off = &off
	}
	return e
}
