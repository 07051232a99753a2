package web

import (
	"net/http"
	"reflect"

	"github.com/danielgtaylor/huma/v2"

	"nightbench/sweeps"
)

//go:generate go test -run TestOpenAPI -update .

// newRegistry is huma's registry, told of the words that stand for themselves.
// The stand-ins live here so that the nouns need not know the web.
func newRegistry() huma.Registry {
	r := huma.NewMapRegistry("#/components/schemas/", huma.DefaultSchemaNamer)
	r.RegisterTypeAlias(reflect.TypeFor[sweeps.State](), reflect.TypeFor[stateWord]())
	r.RegisterTypeAlias(reflect.TypeFor[sweeps.Kind](), reflect.TypeFor[kindWord]())
	r.RegisterTypeAlias(reflect.TypeFor[sweeps.Energised](), reflect.TypeFor[energisedWord]())
	r.RegisterTypeAlias(reflect.TypeFor[sweeps.Quantity](), reflect.TypeFor[quantityWord]())
	return r
}

type (
	stateWord     string
	kindWord      string
	energisedWord string
	quantityWord  string
)

func (stateWord) Schema(huma.Registry) *huma.Schema {
	return oneOf(sweeps.Preparing, sweeps.Running, sweeps.HeldState, sweeps.Asking, sweeps.MakingSafe,
		sweeps.Done, sweeps.Stopped, sweeps.Tripped, sweeps.Failed, sweeps.Interrupted)
}

func (kindWord) Schema(huma.Registry) *huma.Schema {
	return oneOf(sweeps.KindStarted, sweeps.KindState, sweeps.KindEnergising, sweeps.KindOff, sweeps.KindPoint, sweeps.KindLog, sweeps.KindTrip, sweeps.KindEnded)
}

func (energisedWord) Schema(huma.Registry) *huma.Schema {
	return oneOf(sweeps.EnergisedYes, sweeps.EnergisedNo, sweeps.EnergisedUnconfirmed)
}

func (quantityWord) Schema(huma.Registry) *huma.Schema {
	var names []sweeps.Quantity
	for _, q := range sweeps.Quantities {
		names = append(names, q.Name)
	}
	return oneOf(names...)
}

// oneOf is the schema of a word out of few.
func oneOf[T ~string](words ...T) *huma.Schema {
	s := &huma.Schema{Type: huma.TypeString}
	for _, w := range words {
		s.Enum = append(s.Enum, string(w))
	}
	return s
}

// neverNull says of every list that it is one: orEmpty keeps the promise. Lists
// left out when empty are optional already.
func neverNull(r huma.Registry) {
	for _, s := range r.Map() {
		for _, p := range s.Properties {
			if p.Type == huma.TypeArray {
				p.Nullable = false
			}
		}
	}
}

// seedAsText says what the encoding makes of a run's seed: JavaScript keeps 53 bits of a number.
func seedAsText(r huma.Registry) {
	r.Map()["Run"].Properties["seed"] = &huma.Schema{Type: huma.TypeString, Pattern: `^\d+$`, Description: "Of the order of visit and the bands; a whole number of up to 64 bits."}
}

// describeStream puts the stream and its messages into the same description,
// so that the page's types come from one file. The messages are told apart by
// their one-value kind.
func describeStream(api huma.API) {
	r := api.OpenAPI().Components.Schemas
	message := &huma.Schema{Description: "What the stream sends, told apart by kind."}
	for _, t := range []reflect.Type{reflect.TypeFor[EntryMessage](), reflect.TypeFor[VitalsMessage](), reflect.TypeFor[CaughtUpMessage]()} {
		message.OneOf = append(message.OneOf, r.Schema(t, true, ""))
	}
	r.Map()["StreamMessage"] = message
	r.Schema(reflect.TypeFor[Hello](), true, "")
	api.OpenAPI().AddOperation(&huma.Operation{
		OperationID: "stream", Method: http.MethodGet, Path: streamPath, Summary: "The tail of the journal, over a websocket",
		Description: "The watcher says Hello within 5 s; then come vitals, every entry after `after` in order, caught_up once, and whatever happens next.",
		Parameters: []*huma.Param{{
			Name: "after", In: "query", Description: "Entries after this seq; -1: from the start of the newest run, and so for a seq that this journal has not reached: it is of another one.",
			Schema: &huma.Schema{Type: huma.TypeInteger, Format: "int64", Minimum: new(float64(fromNewestRun)), Default: 0},
		}},
		Responses: map[string]*huma.Response{
			"101": {Description: "A websocket; text messages, each a StreamMessage.", Content: map[string]*huma.MediaType{"application/json": {Schema: &huma.Schema{Ref: "#/components/schemas/StreamMessage"}}}},
			"403": {Description: "A foreign host or origin."},
			"422": {Description: "`after` is no such number."},
			"503": {Description: "The daemon is ending."},
		},
	})
}
