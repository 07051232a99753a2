package circuit

import "testing"

// BenchmarkWatched is a 1 kHz pump driver with a meter on it: every period is
// integrated.
func BenchmarkWatched(b *testing.B) {
	s := spinning(b, 5e3)
	from := s.Now()
	steps := counter{from: from}
	b.ResetTimer()
	for range b.N {
		v := NewMean(Between(LoadHi, LoadLo), s.Now(), s.Now()+0.1)
		if err := s.Run(s.Now()+0.1, v, &steps); err != nil {
			b.Fatal(err)
		}
		steps.from = s.Now()
	}
	span := s.Now() - from
	b.ReportMetric(span/b.Elapsed().Seconds(), "simulated-s/s")
	b.ReportMetric(float64(steps.n)/span, "steps/simulated-s")
}

// BenchmarkIntegrated is the same with an observer that does nothing.
func BenchmarkIntegrated(b *testing.B) {
	s := spinning(b, 5e3)
	from := s.Now()
	var steps counter
	b.ResetTimer()
	for range b.N {
		steps.from = s.Now()
		if err := s.Run(s.Now()+0.1, &steps); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric((s.Now()-from)/b.Elapsed().Seconds(), "simulated-s/s")
}

// BenchmarkNight is nine hours nobody looks at.
func BenchmarkNight(b *testing.B) {
	s := spinning(b, 5e3)
	from := s.Now()
	b.ResetTimer()
	for range b.N {
		s.Advance(s.Now() + 9*3600)
	}
	b.ReportMetric((s.Now()-from)/b.Elapsed().Seconds(), "simulated-s/s")
}

// counter counts steps.
type counter struct {
	from float64
	n    int
}

func (c *counter) Window() (from, to float64) { return c.from, c.from + 0.1 }
func (c *counter) Observe(*Segment)           { c.n++ }

// spinning is the pump driver on 9 V, its motor up to speed.
func spinning(tb testing.TB, pot float64) *Sim {
	tb.Helper()
	s := mustNew(tb, pump(), 9)
	if err := s.SetPot(pot); err != nil {
		tb.Fatal(err)
	}
	s.Advance(0.5)
	if s.State().Speed == 0 {
		tb.Fatal("the motor does not turn")
	}
	return s
}
