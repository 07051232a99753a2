package bench

import "nightbench/instruments/dialect"

// Unproven names the lines of the supply's dialect that a night relies on and
// that nobody checked: output off, read-back, protection. With any of them
// somebody has to attend.
func (b *Opened) Unproven() []string {
	for _, i := range b.open {
		if i.role == dialect.RoleSupply {
			return i.d.Unproven()
		}
	}
	return nil
}
