package bench

import (
	"cmp"
	"slices"
	"strconv"

	"nightbench/instruments"
	"nightbench/instruments/userfile"
)

// scope reads [scope] and its [scope.channel.N].
func (r *reader) scope(t *userfile.Table) {
	if !t.Present() {
		return
	}
	p := r.port(t)
	r.out.Scope = &p
	w := &instruments.ScopeWiring{}
	r.out.Wiring.Scope = w
	w.Earthed = earthedOf(t, true)
	channels := t.Table("channel")
	for _, key := range channels.Keys() {
		r.scopeChannel(channels, key)
	}
	if t.Has("channel") && len(w.Channels) == 0 && len(channels.Keys()) == 0 {
		t.Fail("channel", "give at least one channel, like [scope.channel.1]")
	}
}

// scopeChannel reads [scope.channel.N]. Channels are kept in the order of their numbers.
func (r *reader) scopeChannel(t *userfile.Table, key string) {
	n, err := strconv.Atoi(key)
	if err != nil || n < 1 || n > 8 || strconv.Itoa(n) != key {
		t.Refuse(key, "a channel's name is its number, from 1 to 8, like [scope.channel.1]")
		return
	}
	w := r.out.Wiring.Scope
	in := t.Table(key)
	c := instruments.ScopeChannelWiring{Number: n}
	if in.Number("probe", &c.Probe) && (c.Probe < 0.1 || c.Probe > 10_000) {
		in.Fail("probe", "give the probe's attenuation, from 0.1 to 10000: 10 for a probe marked ×10")
	}
	if between(in, &c.Between) && w.Earthed {
		r.onEarth(in, "between", c.Between[1])
	}
	w.Channels = append(w.Channels, c)
	slices.SortFunc(w.Channels, func(a, b instruments.ScopeChannelWiring) int { return cmp.Compare(a.Number, b.Number) })
}
