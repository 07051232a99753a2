// Package service holds the files that a system needs to run a bench: for now
// the udev rules.
package service

import _ "embed"

// UdevRules let the group dialout, and whoever sits at the computer, open USB
// instruments.
//
//go:embed 70-nightbench.rules
var UdevRules string
