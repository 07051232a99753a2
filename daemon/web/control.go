package web

import (
	"context"
	"encoding/json"
	"io"
	"net/http"
	"reflect"
	"time"

	"github.com/danielgtaylor/huma/v2"

	"nightbench/sweeps"
)

// Inputs of the calls that command.
type (
	startInput  struct{ Body StartRequest }
	resumeInput struct {
		OfRun
		Body *ResumeRequest
	}
	stopInput struct{ Body *StopRequest }
	byInput   struct{ Body *ByRequest }
	offInput  struct{ by string }
)

// post registers a call that only the operator may make.
func post[I, O any](s *Server, api huma.API, op huma.Operation, do func(context.Context, *I) (O, error)) {
	op.Method = http.MethodPost
	op.Security = []map[string][]string{{"operator": {}}}
	op.BodyReadTimeout = -1 // no limit: one that passed while the daemon still works would call the request off
	op.Errors = []int{400, 403, 404, 409, 422, 502, 503, 507}
	op.Middlewares = huma.Middlewares{func(ctx huma.Context, next func(huma.Context)) {
		if !mayControl(ctx.Context()) {
			huma.WriteErr(api, ctx, statuses[Forbidden], notYours(ctx.Header("Authorization")))
			return
		}
		next(ctx)
	}}
	huma.Register(api, op, func(ctx context.Context, in *I) (*answer[O], error) {
		out, err := do(ctx, in)
		if err != nil {
			return nil, s.problem(err)
		}
		return reply(out), nil
	})
}

// notYours says why a caller may not control, and what to try.
func notYours(authorization string) string {
	if authorization == "" {
		return "you may watch, not control: open the address with #token=… that the daemon printed, or ask 'nightbench token'"
	}
	return "this token is not the daemon's: open the address it printed, or ask 'nightbench token'"
}

// controlCalls registers the commands. Those that make the bench safer are
// carried through even when the asker goes away; starting is not.
func (s *Server) controlCalls(api huma.API) {
	post(s, api, huma.Operation{OperationID: "start", Path: "/api/runs", Summary: "Start a run"},
		func(ctx context.Context, in *startInput) (sweeps.Run, error) {
			r, err := s.o.Control.Start(ctx, in.Body)
			return tidyRun(r), err
		})
	post(s, api, huma.Operation{OperationID: "resume", Path: "/api/runs/{id}/resume", Summary: "Go on with an interrupted run"},
		func(ctx context.Context, in *resumeInput) (sweeps.Run, error) {
			r, err := s.o.Control.Resume(ctx, in.ID, orZero(in.Body).Operator)
			return tidyRun(r), err
		})
	post(s, api, huma.Operation{OperationID: "stop", Path: "/api/stop", Summary: "End the run and make the bench safe"},
		func(ctx context.Context, in *stopInput) (Nothing, error) {
			b := orZero(in.Body)
			return Nothing{}, s.o.Control.Stop(context.WithoutCancel(ctx), b.Reason, b.By)
		})
	post(s, api, huma.Operation{OperationID: "hold", Path: "/api/hold", Summary: "Finish the reading in hand, output off"},
		func(ctx context.Context, in *byInput) (Nothing, error) {
			return Nothing{}, s.o.Control.Hold(context.WithoutCancel(ctx), orZero(in.Body).By)
		})
	post(s, api, huma.Operation{OperationID: "continue", Path: "/api/continue", Summary: "Let a held run go on"},
		func(ctx context.Context, in *byInput) (Nothing, error) {
			return Nothing{}, s.o.Control.Continue(ctx, orZero(in.Body).By)
		})
	post(s, api, huma.Operation{OperationID: "off", Path: "/api/off", Summary: "Outputs off: with or without a run, always tries"},
		func(ctx context.Context, in *offInput) (sweeps.Off, error) {
			off, err := s.o.Control.Off(context.WithoutCancel(ctx), in.by)
			off.By = orEmpty(off.By)
			return off, err
		})
	describeOff(api)
}

// Bounds on what is read of a request for Outputs off before the outputs go off.
const (
	offBytes = 4096
	offWait  = time.Second
)

// Resolve reads who asks. The body is read here and not by huma, which would
// turn a broken one away: whatever is in it, and however slowly it comes, the outputs go off.
func (in *offInput) Resolve(ctx huma.Context) []error {
	if ctx.SetReadDeadline(time.Now().Add(offWait)) != nil {
		return nil // a connection whose reading can't be bounded is not waited for
	}
	defer ctx.SetReadDeadline(time.Time{}) // else it would pass while the outputs go off
	body, err := io.ReadAll(io.LimitReader(ctx.BodyReader(), offBytes))
	var who ByRequest
	if err == nil && json.Unmarshal(body, &who) == nil {
		in.by = who.By
	}
	return nil
}

// describeOff adds to the description the body that huma does not know of.
func describeOff(api huma.API) {
	schema := api.OpenAPI().Components.Schemas.Schema(reflect.TypeFor[ByRequest](), true, "")
	api.OpenAPI().Paths["/api/off"].Post.RequestBody = &huma.RequestBody{Content: map[string]*huma.MediaType{"application/json": {Schema: schema}}}
}

func orZero[T any](p *T) (v T) {
	if p != nil {
		v = *p
	}
	return v
}
