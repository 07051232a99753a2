package web

import (
	"io/fs"
	"net/http"
	"path"
	"strings"
)

// notBuilt stands in where the page was not built into the program.
const notBuilt = `<!doctype html>
<html lang="en">
<meta charset="utf-8">
<meta name="viewport" content="width=device-width">
<title>Nightbench</title>
<h1>The page is not built into this program</h1>
<p>The bench runs and its journal is kept; only the page is missing. Build it with Node 20 or newer:</p>
<pre>make ui
go build -o nightbench ./daemon</pre>
<p>Until then: <code>nightbench runs</code>, <code>nightbench show</code>, <code>nightbench stop</code>,
or <a href="/api/status">what the bench is doing</a> as JSON.</p>
<p>Software switches outputs off; it is no emergency stop. Keep the mains switch within reach.</p>
</html>
`

// routes are the views of the page; each is index.html, which looks at the address itself.
var routes = []string{"/", "/runs", "/runs/{id}", "/bench", "/boards", "/boards/{hash}"}

// page serves the built page, its files at the root.
func page(files fs.FS) http.Handler {
	mux := http.NewServeMux()
	index := indexOf(files)
	for _, r := range routes {
		if r == "/" {
			r = "/{$}"
		}
		mux.HandleFunc("GET "+r, func(w http.ResponseWriter, _ *http.Request) {
			w.Header().Set("Cache-Control", "no-cache")
			w.Header().Set("Content-Type", "text/html; charset=utf-8")
			w.Write(index)
		})
	}
	mux.HandleFunc("GET /{file...}", func(w http.ResponseWriter, r *http.Request) { pageFile(w, r, files) })
	return mux
}

func indexOf(files fs.FS) []byte {
	if files != nil {
		if b, err := fs.ReadFile(files, "index.html"); err == nil {
			return b
		}
	}
	return []byte(notBuilt)
}

// pageFile serves one file of the page. Those under assets carry a hash in their name and never change.
func pageFile(w http.ResponseWriter, r *http.Request, files fs.FS) {
	name := strings.TrimPrefix(path.Clean(r.URL.Path), "/")
	if files == nil || strings.HasPrefix(path.Base(name), ".") {
		http.NotFound(w, r)
		return
	}
	if i, err := fs.Stat(files, name); err != nil || i.IsDir() {
		http.NotFound(w, r)
		return
	}
	if strings.HasPrefix(name, "assets/") {
		w.Header().Set("Cache-Control", "public, max-age=31536000, immutable")
	} else {
		w.Header().Set("Cache-Control", "no-cache")
	}
	http.ServeFileFS(w, r, files, name)
}
