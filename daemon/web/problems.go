package web

import (
	"context"
	"encoding/json"
	"errors"
	"net/http"

	"github.com/danielgtaylor/huma/v2"

	"nightbench/daemon/store"
)

// Kind says to whom an error belongs: the asker, the moment, or the bench.
type Kind string

// The kinds. An error of none is Internal.
const (
	Invalid     Kind = "invalid"     // the file or the request is wrong
	Conflict    Kind = "conflict"    // it does not go with what is going on
	NotFound    Kind = "not_found"   // there is no such thing
	Forbidden   Kind = "forbidden"   // the asker may only watch
	Trouble     Kind = "trouble"     // an instrument or a link failed
	Unavailable Kind = "unavailable" // the daemon is not ready, or ending
	Full        Kind = "full"        // no room on the disk
	Internal    Kind = "internal"
)

// statuses is the one place where a kind becomes an HTTP status.
var statuses = map[Kind]int{
	Invalid:     http.StatusUnprocessableEntity,
	Conflict:    http.StatusConflict,
	NotFound:    http.StatusNotFound,
	Forbidden:   http.StatusForbidden,
	Trouble:     http.StatusBadGateway,
	Unavailable: http.StatusServiceUnavailable,
	Full:        http.StatusInsufficientStorage,
	Internal:    http.StatusInternalServerError,
}

// Kinded is an error that knows its kind.
type Kinded interface {
	error
	Kind() Kind
}

// Fail gives an error a kind; nil stays nil.
func Fail(k Kind, err error) error {
	if err == nil {
		return nil
	}
	return &failure{err, k}
}

type failure struct {
	error
	kind Kind
}

func (f *failure) Kind() Kind    { return f.kind }
func (f *failure) Unwrap() error { return f.error }

// kindOf is the kind an error says it has, or that of the store's sentinel in it.
func kindOf(err error) Kind {
	var k Kinded
	switch {
	case errors.As(err, &k):
		return k.Kind()
	case errors.Is(err, store.ErrNotFound):
		return NotFound
	case errors.Is(err, store.ErrRunOpen), errors.Is(err, store.ErrDuplicate):
		return Conflict
	case errors.Is(err, store.ErrFull):
		return Full
	case errors.Is(err, store.ErrClosed), errors.Is(err, context.Canceled), errors.Is(err, context.DeadlineExceeded):
		return Unavailable
	}
	return Internal
}

// problem is an error as the API answers it (RFC 9457): its words are the detail.
func (s *Server) problem(err error) error {
	k := kindOf(err)
	if k == Internal {
		s.o.Log.Error("request failed", "err", err)
	}
	return huma.NewError(statuses[k], err.Error())
}

// answerProblem writes a problem where no operation is at hand.
func answerProblem(w http.ResponseWriter, k Kind, words string) {
	w.Header().Set("Content-Type", "application/problem+json")
	w.WriteHeader(statuses[k])
	json.NewEncoder(w).Encode(huma.NewError(statuses[k], words)) // the asker may have gone: nobody is left to tell
}

func noSuchCall(w http.ResponseWriter, r *http.Request) {
	answerProblem(w, NotFound, r.Method+" "+r.URL.Path+": there is no such call; openapi.json lists those there are")
}
