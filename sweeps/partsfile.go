package sweeps

import (
	"os"
	"path/filepath"
	"strings"

	"nightbench/instruments/userfile"
)

// PartsSuffix ends the name of a file of the user's own catalogue parts. All such
// files in the folder of a board file belong to it.
const PartsSuffix = ".parts.toml"

// RoleParts is the role of a parts file among those kept with a run.
const RoleParts = "parts"

// partsBeside reads the parts files in the folder of a board file, by name. What
// the parts are is for the prediction to read; here only their form is looked at.
func partsBeside(board string) ([]File, error) {
	dir := filepath.Dir(board)
	entries, err := os.ReadDir(dir)
	if err != nil {
		return nil, &userfile.Error{File: dir, Want: "can't be searched for parts files: " + err.Error(), Err: err}
	}
	var parts []File
	var mistakes []error
	for _, e := range entries {
		if !strings.HasSuffix(e.Name(), PartsSuffix) {
			continue
		}
		f, err := userfile.Read(filepath.Join(dir, e.Name()))
		if err != nil {
			mistakes = append(mistakes, err)
			continue
		}
		parts = append(parts, File{Role: RoleParts, Name: f.Name, Text: f.Source})
	}
	return parts, userfile.Join(mistakes...)
}

// PartsOf are the parts files among a run's own copies, in the order kept.
func PartsOf(files []File) (parts []File) {
	for _, f := range files {
		if f.Role == RoleParts {
			parts = append(parts, f)
		}
	}
	return parts
}
