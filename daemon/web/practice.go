package web

import (
	"context"
	"errors"

	"github.com/danielgtaylor/huma/v2"
)

// Practice is the practice bench as the web sees it, where there is one in this process.
type Practice interface {
	Faults() PracticeFaults
	// Inject brings a fault about; what is wrong with it is an Invalid error.
	Inject(f PracticeFault) error
	// Lift ends a fault, wherever it is when on is empty, and tells whether there was one.
	Lift(kind, on string) bool
}

// PracticeFault is one thing wrong with the practice bench.
type PracticeFault struct {
	Kind  string  `json:"kind" minLength:"1" doc:"One of the kinds that GET /api/practice lists."`
	On    string  `json:"on,omitempty" doc:"An instrument's name or a part of the board; what its kind says."`
	Size  float64 `json:"size,omitempty" doc:"In the unit of its kind; 0 or left out: the kind's own."`
	Times int     `json:"times,omitempty" minimum:"0" doc:"Replies it spoils, then it is over; 0: until lifted."`
	For   float64 `json:"for,omitempty" minimum:"0" doc:"Seconds of bench time until it lifts itself; 0: until lifted."`
	Says  string  `json:"says,omitempty" doc:"What another client says."`
}

// PracticeKind is a kind of fault and what it needs.
type PracticeKind struct {
	Kind    string   `json:"kind"`
	Words   string   `json:"words"`
	On      []string `json:"on" doc:"Where it can be; empty: it is on no single thing."`
	Unit    string   `json:"unit,omitempty" doc:"Of its size; left out: it has none."`
	Default float64  `json:"default,omitempty" doc:"Its size when none is given."`
	Counted bool     `json:"counted" doc:"It can be over after some replies."`
	Lasting bool     `json:"lasting" doc:"It lasts until lifted; otherwise it happens at one instant."`
}

// PracticeFaults are the kinds there are and the faults in force.
type PracticeFaults struct {
	Kinds   []PracticeKind  `json:"kinds"`
	InForce []PracticeFault `json:"in_force"`
}

// LiftRequest says which fault is to end.
type LiftRequest struct {
	Kind string `json:"kind" minLength:"1"`
	On   string `json:"on,omitempty" doc:"Left out: wherever it is."`
}

type (
	faultInput struct{ Body PracticeFault }
	liftInput  struct{ Body LiftRequest }
)

// notPractice refuses faults where the instruments are real, or simulated elsewhere.
var notPractice = Fail(Conflict, errors.New("faults are for a practice bench that runs in this program ('nightbench demo'); this bench is not one"))

func (s *Server) practiceCalls(api huma.API) {
	get(s, api, "practice", "/api/practice", "What can go wrong on the practice bench, and what has; nothing on another bench", func(context.Context, *none) (PracticeFaults, error) {
		if s.o.Practice == nil {
			return tidyFaults(PracticeFaults{}), nil
		}
		return tidyFaults(s.o.Practice.Faults()), nil
	})
	post(s, api, huma.Operation{OperationID: "fault", Path: "/api/practice/fault", Summary: "Bring a fault about, on a practice bench only"},
		func(_ context.Context, in *faultInput) (PracticeFaults, error) {
			return s.practice(func(p Practice) error { return p.Inject(in.Body) })
		})
	post(s, api, huma.Operation{OperationID: "lift", Path: "/api/practice/lift", Summary: "End a fault of the practice bench"},
		func(_ context.Context, in *liftInput) (PracticeFaults, error) {
			return s.practice(func(p Practice) error {
				if !p.Lift(in.Body.Kind, in.Body.On) {
					return Fail(NotFound, errors.New("no such fault is in force"))
				}
				return nil
			})
		})
}

// practice does something to the practice bench and answers how it is then.
func (s *Server) practice(do func(Practice) error) (PracticeFaults, error) {
	if s.o.Practice == nil {
		return PracticeFaults{}, notPractice
	}
	if err := do(s.o.Practice); err != nil {
		return PracticeFaults{}, err
	}
	return tidyFaults(s.o.Practice.Faults()), nil
}

func tidyFaults(f PracticeFaults) PracticeFaults {
	f.Kinds, f.InForce = orEmpty(f.Kinds), orEmpty(f.InForce)
	for i := range f.Kinds {
		f.Kinds[i].On = orEmpty(f.Kinds[i].On)
	}
	return f
}
