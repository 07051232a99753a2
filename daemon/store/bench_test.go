package store

import (
	"testing"
	"time"

	"nightbench/sweeps"
)

// BenchmarkAppend appends whole points and, in the same run on the same file,
// bare one-row inserts with the same settings: what a point costs beyond the
// fsync that makes it durable.
func BenchmarkAppend(b *testing.B) {
	s := openStore(b)
	run := mustRun(b, s)
	if _, err := s.write.Exec(`CREATE TABLE bare (id INTEGER PRIMARY KEY, words TEXT) STRICT`); err != nil {
		b.Fatal(err)
	}
	var points, bare time.Duration
	i := 0
	for b.Loop() {
		begin := time.Now()
		mustAppend(b, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(i)})
		middle := time.Now()
		if _, err := s.write.Exec(`INSERT INTO bare (words) VALUES ('tick')`); err != nil {
			b.Fatal(err)
		}
		points, bare = points+middle.Sub(begin), bare+time.Since(middle)
		i++
	}
	b.ReportMetric(float64(points)/float64(bare), "×bare")
	b.ReportMetric(float64(i)/points.Seconds(), "points/s")
}

// BenchmarkReplay reads a night of 500 points the way a watcher does; points/s against a bare count of their rows.
func BenchmarkReplay(b *testing.B) {
	s := openStore(b)
	run := mustRun(b, s)
	for i := range 500 {
		mustAppend(b, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(i)})
	}
	for b.Loop() {
		for after := int64(0); after < 500; {
			es, err := s.Entries(b.Context(), after, 100)
			if err != nil {
				b.Fatal(err)
			}
			after = es[len(es)-1].Seq
		}
	}
	b.ReportMetric(500*float64(b.N)/b.Elapsed().Seconds(), "points/s")
}
