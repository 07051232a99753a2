package web

import (
	"io/fs"
	"net/http"
	"net/http/httptest"
	"regexp"
	"strings"
	"testing"
	"testing/fstest"

	"nightbench/ui"
)

func TestPage(t *testing.T) {
	h := newHouse(t)
	for _, view := range []string{"/", "/runs", "/runs/12", "/bench", "/boards", "/boards/" + ofBoard} {
		got := h.ask("GET", view, "", nil)
		if got.status != http.StatusOK || !strings.Contains(got.body, "leaf") || got.header.Get("Content-Type") != "text/html; charset=utf-8" || got.header.Get("Cache-Control") != "no-cache" {
			t.Errorf("%s: %d %s %v", view, got.status, got.body, got.header)
		}
	}
	js := h.ask("GET", "/assets/leaf-1a2b.js", "", nil)
	if js.body != "let leaf" || !strings.Contains(js.header.Get("Content-Type"), "javascript") || !strings.Contains(js.header.Get("Cache-Control"), "immutable") {
		t.Errorf("script: %+v", js)
	}
	for _, none := range []string{"/gossip", "/assets", "/assets/", "/.keep", "/runs/1/points", "/../web.go", "/%2e%2e/web.go"} {
		if got := h.ask("GET", none, "", nil); got.status != http.StatusNotFound {
			t.Errorf("%s: %d", none, got.status)
		}
	}
	if got := h.ask("POST", "/", "", operator); got.status != http.StatusMethodNotAllowed {
		t.Errorf("POST to the page: %d", got.status)
	}
}

// TestPageNotBuilt: without a built page the program says how to build it, and
// loads nothing from elsewhere.
func TestPageNotBuilt(t *testing.T) {
	for name, files := range map[string]fs.FS{"none": nil, "only the marker": fstest.MapFS{".keep": {}}} {
		w := httptest.NewRecorder()
		page(files).ServeHTTP(w, httptest.NewRequest("GET", "/", nil))
		body := w.Body.String()
		if w.Code != http.StatusOK || !strings.Contains(body, "make ui") {
			t.Errorf("%s: %d %s", name, w.Code, body)
		}
		if regexp.MustCompile(`(?i)https?://|<script|<style|style=`).MatchString(body) {
			t.Errorf("%s: the page loads or runs something", name)
		}
	}
}

// TestBuiltInPage serves whatever page this program was built with.
func TestBuiltInPage(t *testing.T) {
	w := httptest.NewRecorder()
	page(ui.Page()).ServeHTTP(w, httptest.NewRequest("GET", "/", nil))
	if w.Code != http.StatusOK || !strings.Contains(strings.ToLower(w.Body.String()), "<!doctype html>") {
		t.Errorf("%d %s", w.Code, w.Body)
	}
}
