package dialect

import (
	"cmp"
	"fmt"
	"slices"
	"strings"
)

// Table is the dialects as a table in Markdown, a role after the other in the
// order given: for the README.
func Table(all []*Dialect, roles ...Role) string {
	var b strings.Builder
	b.WriteString("| dialect | family | manuals its lines come from | statements: manual / ours / unchecked | unchecked guards | tried on a device |\n|---|---|---|---|---|---|\n")
	for _, role := range roles {
		of := slices.DeleteFunc(slices.Clone(all), func(d *Dialect) bool { return d.Head.Role != role })
		slices.SortFunc(of, func(a, b *Dialect) int { return cmp.Compare(a.Head.Name, b.Head.Name) })
		if len(of) > 0 {
			fmt.Fprintf(&b, "| **%s** | | | | | |\n", role)
		}
		for _, d := range of {
			checked, ours, unchecked := d.Count()
			fmt.Fprintf(&b, "| `%s` | %s | %s | %d / %d / %d | %s | %s |\n", d.Head.Name, d.Head.About, cmp.Or(strings.Join(d.Manuals(), "; "), "none"),
				checked, ours, unchecked, cmp.Or(strings.Join(d.Unproven(), ", "), "none"), cmp.Or(d.Head.Tried, "never"))
		}
	}
	return b.String()
}
