package driver

import (
	"context"
	"math"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/si"
)

// setChannel switches a channel on, couples it DC, tells it the probe, and sets its screen.
func (s *Scope) setChannel(ctx context.Context, c *instruments.ScopeChannel) (err error) {
	p := func(v float64) dialect.Put { return s.d.Put(v, c.Number) }
	if err := s.ensureEach(ctx, p(0), "show", "coupling"); err != nil {
		return err
	}
	if c.Probe > 0 && (s.has("probe") || c.Probe != 1) {
		if c.Probe, err = s.instrument.set(ctx, "probe", p(c.Probe), si.One); err != nil {
			return err
		}
	}
	if !s.has("range_high") {
		return s.setScale(ctx, c, p)
	}
	height := c.High - c.Low
	if c.High, err = s.edge(ctx, "range_high", p(c.High), height); err != nil {
		return err
	}
	c.Low, err = s.edge(ctx, "range_low", p(c.Low), height)
	return err
}

// ensureEach sends those of the lines that the dialect has.
func (s *Scope) ensureEach(ctx context.Context, p dialect.Put, names ...string) error {
	for _, name := range names {
		if !s.has(name) {
			continue
		}
		if err := s.ensure(ctx, name, p); err != nil {
			return err
		}
	}
	return nil
}

// edge sets one end of the screen. Its departure is judged against the height
// of the screen, since an end may be 0 V.
func (s *Scope) edge(ctx context.Context, name string, p dialect.Put, height float64) (float64, error) {
	l, found, err := s.assign(ctx, name, p)
	if err != nil {
		return 0, err
	}
	if off := found - p.Value; max(off, -off) > max(l.Within, 1e-6)*height {
		return 0, s.refused(ctx, p.Fill(l.Send), si.Format(found, si.Volt))
	}
	return found, nil
}

// screenSlack is how much of the height wanted may lie outside the screen that
// a scope of steps gives: less than the step of its offset.
const screenSlack = 0.02

// setScale sets volts a division and offset, in that order, since the scale
// limits the offset, and holds what they give against what was wanted.
func (s *Scope) setScale(ctx context.Context, c *instruments.ScopeChannel, p func(float64) dialect.Put) error {
	screen, height := s.d.Screen, c.High-c.Low
	l, scale, err := s.assign(ctx, "vertical_scale", p(height/screen.Divisions))
	if err != nil {
		return err
	}
	if scale < height/screen.Divisions*(1-1e-6) {
		return s.refused(ctx, p(height/screen.Divisions).Fill(l.Send), si.Format(scale, si.Volt)+" a division")
	}
	offset := offsetOf(screen.Offset, scale)
	l, found, err := s.assign(ctx, "vertical_offset", p(offset.of((c.High+c.Low)/2)))
	if err != nil {
		return err
	}
	middle, half := offset.middle(found), scale*screen.Divisions/2
	if middle+half < c.High-screenSlack*height || middle-half > c.Low+screenSlack*height {
		return s.refused(ctx, p(offset.of((c.High+c.Low)/2)).Fill(l.Send), "a screen from "+si.FormatRange(middle-half, middle+half, si.Volt))
	}
	c.Low, c.High = middle-half, middle+half
	return nil
}

// offset turns the middle of the screen, V, into what vertical_offset says: middle × factor.
type offset struct{ factor float64 }

func offsetOf(kind string, scale float64) offset {
	switch kind {
	case "shift":
		return offset{-1}
	case "divisions":
		return offset{-1 / scale}
	}
	return offset{1}
}

func (o offset) of(middle float64) float64 {
	if middle == 0 {
		return 0 // and not -0
	}
	return middle * o.factor
}

func (o offset) middle(said float64) float64 { return said / o.factor }

// setPoints sets the count of samples, where it can be set: the next count up
// that the scope has, or its highest.
func (s *Scope) setPoints(ctx context.Context, want int) (int, error) {
	if !s.has("points") {
		return s.d.Waveform.Points, nil
	}
	v := float64(want)
	if highest := s.d.Commands["points"].Highest(); highest.Word != "" {
		_, found, err := s.assign(ctx, "points", s.put(math.Min(v, highest.Value)))
		return int(found), err
	}
	found, err := s.instrument.set(ctx, "points", s.put(v), si.One)
	return int(found), err
}

// setDuration sets the time base: the duration itself, or seconds a division,
// the next step up.
func (s *Scope) setDuration(ctx context.Context, want float64) (float64, error) {
	if s.has("duration") {
		return s.instrument.set(ctx, "duration", s.put(want), si.Second)
	}
	wide := s.d.Screen.TimeDivisions
	l, found, err := s.assign(ctx, "time_scale", s.put(want/wide))
	if err != nil {
		return 0, err
	}
	if found < want/wide*(1-1e-6) {
		return 0, s.refused(ctx, s.put(want/wide).Fill(l.Send), si.Format(found, si.Second)+" a division")
	}
	return found * wide, nil
}
