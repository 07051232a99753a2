package dialect

import (
	"errors"
	"strings"
	"testing"

	"nightbench/instruments/userfile"
)

// Whatever line is missing, reading a dialect ends: well, or with mistakes that name the file.
func TestEveryMissingLine(t *testing.T) {
	for _, c := range []struct {
		role Role
		name string
	}{{RoleSupply, "gwinstek-gpd"}, {RoleMeter, "keithley-2000"}, {RoleScope, "tektronix-tds2000"}, {RoleScope, "siglent-sds1000xe"}, {RolePot, "nightbench-pot"}} {
		lines := strings.SplitAfter(mustFind(t, c.role, c.name).Text, "\n")
		refused := 0
		for n := range lines {
			_, err := Parse("own.toml", []byte(strings.Join(lines[:n], "")+strings.Join(lines[n+1:], "")))
			var one *userfile.Error
			switch {
			case err == nil:
			case !errors.As(err, &one) || one.File != "own.toml":
				t.Errorf("%s without line %d: %v", c.name, n+1, err)
			default:
				refused++
			}
		}
		if refused < len(lines)/5 {
			t.Errorf("%s: only %d of %d lines are missed", c.name, refused, len(lines))
		}
	}
}
