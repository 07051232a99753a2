package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/fstest"
	"time"

	"go.uber.org/goleak"

	"nightbench/instruments"
	"nightbench/migrations"
	"nightbench/sweeps"
)

func TestMain(m *testing.M) {
	if dir := os.Getenv(crashFolder); dir != "" {
		crashChild(dir)
	}
	goleak.VerifyTestMain(m)
}

// openStore opens a fresh journal in a folder of the test's own.
func openStore(tb testing.TB) *Store {
	tb.Helper()
	return openAt(tb, filepath.Join(tb.TempDir(), "nightbench.db"))
}

func openAt(tb testing.TB, path string) *Store {
	tb.Helper()
	s, err := Open(context.Background(), path, instruments.NewClock(1))
	if err != nil {
		tb.Fatal(err)
	}
	tb.Cleanup(func() {
		if err := s.Close(context.Background()); err != nil {
			tb.Error(err)
		}
	})
	return s
}

func sampleRun() sweeps.Run {
	return sweeps.Run{
		Plan: "Overnight characterisation", Board: "Dosing pump driver", Revision: "B", BoardSerial: "0017", Bench: "Bench 2",
		Operator: "J. Moss", Note: "after the diode change", Planned: 150, Pace: 1, Seed: 1<<64 - 1, Version: "v0.1.0",
		Quantities: []sweeps.Quantity{sweeps.Duty, sweeps.AverageVoltage}, Instruments: []string{"supply: Example PSU-1"},
		Files: []sweeps.File{{Role: "plan", Name: "plan.toml", SHA256: "00", Text: "[plan]\n"}, {Role: "board", Name: "board.toml", SHA256: "01", Text: "[board]\n"}},
	}
}

func samplePoint(index int) *sweeps.Point {
	p := &sweeps.Point{
		Setpoint: sweeps.Setpoint{Index: index, Supply: 9, PotCode: 26, Pot: 10192, Direction: sweeps.Up, Pass: 1},
		Elapsed:  float64(index) * 12.5,
		Readings: []sweeps.Reading{
			sweeps.Measured(sweeps.Duty, 0.4521, 0.0003, 4, "scope ch 1"),
			sweeps.Measured(sweeps.AverageVoltage, 3.912, 0.0016, 0, "meter average"),
			sweeps.Measured(sweeps.AverageVoltage, 3.94, 0.12, 0, "scope ch 1"),
			sweeps.NoValue(sweeps.MotorCurrent, "meter motor", sweeps.Flag{Name: "overload", Words: "the meter was over its range"}),
		},
		Predictions: map[sweeps.Quantity]sweeps.Prediction{sweeps.Duty: {Value: 0.45, Low: 0.44, High: 0.46, Unit: "1"}},
		Flags:       []sweeps.Flag{},
		Records:     []sweeps.Record{{Node: "timer_out less common", Channel: 1, Start: -1e-4, Interval: 1e-6, VoltsPerCode: 4e-4, VoltsAtZero: 0.1, Codes: []int16{-32768, -1, 0, 1, 32767}}},
	}
	p.Readings[1].Raw = []string{"+3.91200000E+00"}
	return p
}

func mustRun(tb testing.TB, s *Store) sweeps.Run {
	tb.Helper()
	r, err := s.CreateRun(context.Background(), sampleRun())
	if err != nil {
		tb.Fatal(err)
	}
	return r
}

func mustAppend(tb testing.TB, s *Store, e sweeps.Entry) sweeps.Entry {
	tb.Helper()
	e, err := s.Append(context.Background(), e)
	if err != nil {
		tb.Fatal(err)
	}
	return e
}

// TestSettingsHoldOnEveryConnection holds one connection of each pool and asks the second.
func TestSettingsHoldOnEveryConnection(t *testing.T) {
	s := openStore(t)
	s.write.SetMaxOpenConns(2)
	// 2 is FULL (sqlite.org/pragma.html#pragma_synchronous); a reader's own
	// synchronous setting means nothing, since it writes nothing.
	pools := []struct {
		name string
		db   *sql.DB
		want map[string]string
	}{
		{"writer", s.write, map[string]string{"journal_mode": "wal", "synchronous": "2", "foreign_keys": "1", "busy_timeout": "5000", "query_only": "0"}},
		{"reader", s.read, map[string]string{"journal_mode": "wal", "foreign_keys": "1", "busy_timeout": "5000", "query_only": "1"}},
	}
	for _, p := range pools {
		first, err := p.db.Conn(t.Context())
		if err != nil {
			t.Fatal(err)
		}
		for name, want := range p.want {
			var got string
			if err := p.db.QueryRow("PRAGMA " + name).Scan(&got); err != nil || got != want {
				t.Errorf("%s: %s is %q (%v), want %q", p.name, name, got, err, want)
			}
		}
		first.Close()
	}
	if _, err := s.read.Exec(`DELETE FROM run`); err == nil {
		t.Error("a reading connection wrote")
	}
}

// TestWriterTakesItsLockAtOnce: with _txlock=immediate a second writer waits at
// BEGIN rather than failing halfway through.
func TestWriterTakesItsLockAtOnce(t *testing.T) {
	s := openStore(t)
	tx, err := s.write.Begin()
	if err != nil {
		t.Fatal(err)
	}
	defer tx.Rollback()
	other, err := connect(s.path, strings.Replace(writerSettings, "5000", "1", 1), 1)
	if err != nil {
		t.Fatal(err)
	}
	defer other.Close()
	if _, err := other.Begin(); err == nil {
		t.Error("two writers began at once")
	}
}

func TestTablesAreStrict(t *testing.T) {
	s := openStore(t)
	rows, err := collect(t.Context(), s, scanName, `SELECT name FROM pragma_table_list WHERE schema = 'main' AND type = 'table' AND NOT strict AND name NOT LIKE 'sqlite_%' AND name NOT LIKE 'goose_%'`)
	if err != nil || len(rows) != 0 {
		t.Errorf("tables not strict: %v (%v)", rows, err)
	}
}

func scanName(rows *sql.Rows) (n string, err error) { return n, rows.Scan(&n) }

// TestFilesAreTheOwners: the file and its helpers, in a folder with an odd name, are nobody else's.
func TestFilesAreTheOwners(t *testing.T) {
	path := filepath.Join(t.TempDir(), "bench #2?x=1 %41", "nightbench.db")
	mustRun(t, openAt(t, path))
	for _, name := range []string{path, path + "-wal", path + "-shm", path + ".reserve"} {
		if i, err := os.Stat(name); err != nil || i.Mode().Perm() != 0o600 {
			t.Errorf("%v %v", i, err)
		}
	}
}

func TestStateFolderCantBeWritten(t *testing.T) {
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	for _, path := range []string{filepath.Join(file, "nightbench.db"), t.TempDir()} { // below a file; a folder itself
		if _, err := Open(t.Context(), path, instruments.NewClock(1)); err == nil || !strings.Contains(err.Error(), "state folder") {
			t.Errorf("%s: %v", path, err)
		}
	}
}

// steps are the journal's first n.
func steps(t *testing.T, n int) fstest.MapFS {
	t.Helper()
	names, err := fs.Glob(migrations.FS, "*.sql")
	if err != nil || len(names) < n {
		t.Fatalf("%d steps, %v", len(names), err)
	}
	all := fstest.MapFS{}
	for _, name := range names[:n] {
		text, err := migrations.FS.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		all[name] = &fstest.MapFile{Data: text}
	}
	return all
}

// later is the journal's steps and one more, from a program to come.
func later(t *testing.T) fstest.MapFS {
	all := steps(t, newestStep)
	all["00099_extra.sql"] = &fstest.MapFile{Data: []byte("-- +goose Up\nALTER TABLE run ADD COLUMN colour TEXT NOT NULL DEFAULT '';\n")}
	return all
}

// newestStep is the number of the journal's last step.
const newestStep = 2

// A journal begun by the first version goes on: its points have no position.
func TestPointsOfTheFirstVersion(t *testing.T) {
	path := filepath.Join(t.TempDir(), "nightbench.db")
	s, err := open(t.Context(), path, instruments.NewClock(1), steps(t, 1))
	if err != nil {
		t.Fatal(err)
	}
	run := mustRun(t, s)
	if _, err := s.write.Exec(`INSERT INTO point (run, setpoint, supply_voltage, pot_code, pot_resistance, direction, pass, recheck, at, elapsed, flags)
		VALUES (?, 0, 9, 3, 1247, 'up', 0, 0, '2025-03-01T22:00:00.000000Z', 12, '[]')`, run.ID); err != nil {
		t.Fatal(err)
	}
	s.Close(t.Context())
	s = openAt(t, path)
	p := samplePoint(1)
	p.Setpoint.Position = 0.3515625
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: p})
	points, err := s.Points(t.Context(), run.ID)
	if err != nil || len(points) != 2 || points[0].Setpoint.Position != 0 || points[0].Setpoint.Pot != 1247 || points[1].Setpoint.Position != 0.3515625 {
		t.Errorf("%+v, %v", points, err)
	}
}

func TestUpgradeKeepsACopy(t *testing.T) {
	path := filepath.Join(t.TempDir(), "nightbench.db")
	s := openAt(t, path)
	run := mustRun(t, s)
	s.Close(t.Context())

	up, err := open(t.Context(), path, instruments.NewClock(1), later(t))
	if err != nil {
		t.Fatal(err)
	}
	defer up.Close(t.Context())
	if r, err := up.Run(t.Context(), run.ID); err != nil || r.Plan != run.Plan {
		t.Errorf("after the upgrade: %+v, %v", r, err)
	}
	was := openAt(t, fmt.Sprintf("%s.v%d", path, newestStep)) // the copy is a whole store of the version before
	if r, err := was.Run(t.Context(), run.ID); err != nil || r.Plan != run.Plan {
		t.Errorf("in the copy: %+v, %v", r, err)
	}
}

func TestNewerStoreIsRefused(t *testing.T) {
	path := filepath.Join(t.TempDir(), "nightbench.db")
	s, err := open(t.Context(), path, instruments.NewClock(1), later(t))
	if err != nil {
		t.Fatal(err)
	}
	s.Close(t.Context())
	if _, err := Open(t.Context(), path, instruments.NewClock(1)); !errors.Is(err, ErrNewer) || !strings.Contains(err.Error(), path) {
		t.Errorf("got %v, want ErrNewer and the path", err)
	}
	if _, err := OpenReader(t.Context(), path); !errors.Is(err, ErrNewer) {
		t.Errorf("reader: got %v, want ErrNewer", err)
	}
}

func TestForeignDatabaseIsRefused(t *testing.T) {
	path := filepath.Join(t.TempDir(), "other.db")
	db, err := connect(path, writerSettings, 1)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := db.Exec(`CREATE TABLE pump (id INTEGER)`); err != nil {
		t.Fatal(err)
	}
	db.Close()
	if _, err := Open(t.Context(), path, instruments.NewClock(1)); err == nil || !strings.Contains(err.Error(), "not a nightbench store") {
		t.Errorf("got %v", err)
	}
	if err := os.WriteFile(path, []byte(strings.Repeat("no database ", 400)), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := Open(t.Context(), path, instruments.NewClock(1)); err == nil || !strings.Contains(err.Error(), "damaged or no store") {
		t.Errorf("got %v", err)
	}
}

func TestReaderBesideAWriter(t *testing.T) {
	s := openStore(t)
	r, err := OpenReader(t.Context(), s.path)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close(t.Context())
	run := mustRun(t, s)
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(0)})
	if got, err := r.Entries(t.Context(), 0, 10); err != nil || len(got) != 1 || got[0].Point == nil {
		t.Errorf("reader sees %v, %v", got, err)
	}
	if _, err := r.Append(t.Context(), sweeps.Entry{Kind: sweeps.KindLog}); !errors.Is(err, ErrReadOnly) {
		t.Errorf("Append: %v", err)
	}
	if err := r.Wait(t.Context(), 0); !errors.Is(err, ErrReadOnly) {
		t.Errorf("Wait: %v", err)
	}
}

func TestReaderAfterTheWriterLeft(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	s.Close(t.Context())
	r, err := OpenReader(t.Context(), s.path)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close(t.Context())
	if got, err := r.Run(t.Context(), run.ID); err != nil || got.ID != run.ID {
		t.Errorf("got %v, %v", got, err)
	}
	if _, err := OpenReader(t.Context(), filepath.Join(t.TempDir(), "none.db")); !errors.Is(err, ErrNotFound) {
		t.Errorf("no store: %v", err)
	}
}

func TestCloseTwiceAndUseAfterwards(t *testing.T) {
	s := openStore(t)
	for range 2 {
		if err := s.Close(t.Context()); err != nil {
			t.Fatal(err)
		}
	}
	if _, err := s.Append(t.Context(), sweeps.Entry{Kind: sweeps.KindLog, Words: "too late"}); !errors.Is(err, ErrClosed) {
		t.Errorf("Append: %v", err)
	}
	if _, err := s.Runs(t.Context()); !errors.Is(err, ErrClosed) {
		t.Errorf("Runs: %v", err)
	}
	if err := s.Wait(t.Context(), 0); !errors.Is(err, ErrClosed) {
		t.Errorf("Wait: %v", err)
	}
}

// fixedClock stands still at one instant.
type fixedClock struct {
	instruments.Clock
	at time.Time
}

func (c fixedClock) Now() time.Time { return c.at }

func TestTimesComeFromTheClock(t *testing.T) {
	at := time.Date(2026, 11, 3, 2, 14, 0, 123456789, time.FixedZone("", 3600))
	s, err := Open(t.Context(), filepath.Join(t.TempDir(), "nightbench.db"), fixedClock{instruments.NewClock(1), at})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close(t.Context())
	e := mustAppend(t, s, sweeps.Entry{Kind: sweeps.KindLog, Words: "lamp on"})
	if got := fmt.Sprint(e.At); got != "2026-11-03 01:14:00.123456 +0000 UTC" {
		t.Errorf("stamped %s", got)
	}
}
