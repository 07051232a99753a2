// Package migrations holds the numbered steps by which the store's tables came to be.
package migrations

import "embed"

// FS is the steps, 00001 first. A step that has been released is never edited; a new one is added.
//
//go:embed *.sql
var FS embed.FS
