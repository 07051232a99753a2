package web

import (
	"bytes"
	"encoding/json"
	"flag"
	"net/http"
	"os"
	"testing"

	"github.com/danielgtaylor/huma/v2"

	"nightbench/instruments"
)

var update = flag.Bool("update", false, "write openapi.json anew")

// description is the API's description as it is committed: the page's types are made from it.
func description(t *testing.T) (huma.API, []byte) {
	t.Helper()
	s := &Server{o: Options{Clock: instruments.NewClock(1)}}
	api := s.newAPI(http.NewServeMux())
	raw, err := api.OpenAPI().MarshalJSON()
	if err != nil {
		t.Fatal(err)
	}
	var out bytes.Buffer
	if err := json.Indent(&out, raw, "", "  "); err != nil {
		t.Fatal(err)
	}
	out.WriteByte('\n')
	return api, out.Bytes()
}

// TestOpenAPI holds openapi.json to the code. After a change: go generate ./daemon/web, then make the page's types anew.
func TestOpenAPI(t *testing.T) {
	const golden = "openapi.json"
	_, now := description(t)
	if *update {
		if err := os.WriteFile(golden, now, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	was, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(was, now) {
		t.Error("openapi.json differs from the code; run: go generate ./daemon/web")
	}
	if _, again := description(t); !bytes.Equal(now, again) {
		t.Error("the description differs from one making to the next")
	}
}
