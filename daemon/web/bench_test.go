package web

import (
	"fmt"
	"sync"
	"testing"
	"time"

	"nightbench/sweeps"
)

// BenchmarkWatchers appends points alone, then with watchers who hear each of
// them, in one run on one store: what watching costs the run.
func BenchmarkWatchers(b *testing.B) {
	for _, watchers := range []int{1, 20} {
		b.Run(fmt.Sprint(watchers), func(b *testing.B) {
			h := newHouse(b)
			run := h.newRun()
			n := 0
			append := func() time.Duration {
				begin := time.Now()
				h.append(sweeps.Entry{Run: run, Kind: sweeps.KindPoint, Point: point(n)})
				n++
				return time.Since(begin)
			}
			var alone, watched time.Duration
			for range 200 {
				alone += append() / 200
			}
			var all sync.WaitGroup
			for range watchers {
				w := h.watch(201)
				w.expectCaughtUp(201)
				all.Go(func() { w.expect(202, 201+int64(b.N)) })
			}
			b.ResetTimer()
			for range b.N {
				watched += append()
			}
			all.Wait()
			b.ReportMetric(float64(watched)/float64(b.N)/float64(alone), "×alone")
		})
	}
}
