package app

import (
	"slices"

	"nightbench/daemon/web"
	"nightbench/instruments/practice"
)

// practiceWeb lets the web see the practice bench of this process.
type practiceWeb struct{ bench *practice.Bench }

// Faults lists the kinds this bench can have and the faults in force.
func (p practiceWeb) Faults() (f web.PracticeFaults) {
	for _, t := range practice.Traits() {
		f.Kinds = append(f.Kinds, web.PracticeKind{
			Kind: string(t.Kind), Words: t.Words, On: p.places(t), Unit: t.Unit, Default: t.Default, Counted: t.Replies, Lasting: t.Lasting,
		})
	}
	for _, x := range p.bench.Faults() {
		f.InForce = append(f.InForce, web.PracticeFault{Kind: string(x.Kind), On: x.On, Size: x.Size, Times: x.Times, For: x.For, Says: x.Says})
	}
	return f
}

// places are where a kind of fault can be: instruments or parts.
func (p practiceWeb) places(t practice.Trait) []string {
	on := append([]string{}, t.Parts...)
	if t.On != "instrument" && t.On != "any" {
		return on
	}
	for _, i := range p.bench.Instruments() {
		if t.Roles == nil || slices.Contains(t.Roles, i.Role) {
			on = append(on, i.Name)
		}
	}
	return on
}

// Inject brings a fault about.
func (p practiceWeb) Inject(f web.PracticeFault) error {
	return web.Fail(web.Invalid, p.bench.Inject(practice.Fault{Kind: practice.Kind(f.Kind), On: f.On, Size: f.Size, Times: f.Times, For: f.For, Says: f.Says}))
}

// Lift ends a fault.
func (p practiceWeb) Lift(kind, on string) bool { return p.bench.Lift(practice.Kind(kind), on) }
