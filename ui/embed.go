// Package ui holds the page, built into the program.
package ui

import (
	"embed"
	"io/fs"
)

//go:embed all:dist
var dist embed.FS

// Page is the built page, index.html at its root. In a program built without
// Node there is no index.html: only the marker that keeps the folder.
func Page() fs.FS {
	page, err := fs.Sub(dist, "dist")
	if err != nil { // the path is constant and valid
		panic(err)
	}
	return page
}
