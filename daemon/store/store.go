// Package store is the journal: runs, points with their readings, and the
// entries that tell the night in order, in one SQLite file with one writer and
// several readers. What is announced is written in the same transaction, so
// the stream a watcher sees is the tail of this store.
package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"sync"

	_ "github.com/mattn/go-sqlite3" // the driver "sqlite3"

	"nightbench/instruments"
	"nightbench/migrations"
)

// What a caller can branch on. Every other error is the disk's or the database's, with what to try.
var (
	ErrNotFound  = errors.New("not found")
	ErrRunOpen   = errors.New("a run is open")
	ErrNewer     = errors.New("the store is from a newer program")
	ErrOlder     = errors.New("the store is from an older program")
	ErrDuplicate = errors.New("this setpoint is already measured in this run")
	ErrFull      = errors.New("the disk is full")
	ErrReadOnly  = errors.New("the store is open for reading only")
	ErrClosed    = errors.New("the store is closed")
	ErrRefused   = errors.New("refused") // an entry that may not stand in the journal: its words say why
)

// The settings of a connection stand in its address, so that every connection
// of a pool has them. FULL: an acknowledged point survives a power cut.
const (
	writerSettings = "_journal_mode=WAL&_synchronous=FULL&_foreign_keys=1&_busy_timeout=5000&_txlock=immediate"
	readerSettings = "mode=ro&_query_only=1&_foreign_keys=1&_busy_timeout=5000"
	readers        = 4 // page loads and watchers at once; each costs about 2 MB of page cache
)

// Store is one open journal. All methods may be called from any goroutine.
type Store struct {
	path    string
	clock   instruments.Clock
	write   *sql.DB // one connection; nil in a reader
	read    *sql.DB
	bell    *bell
	reserve *reserve

	closing sync.Once
	closed  error
}

// Open opens the journal at path for writing, creating it or bringing its
// tables up to this program's. Before an upgrade a copy is laid beside it. A
// journal from a newer program is refused with [ErrNewer].
func Open(ctx context.Context, path string, clock instruments.Clock) (*Store, error) {
	return open(ctx, path, clock, migrations.FS)
}

func open(ctx context.Context, path string, clock instruments.Clock, steps fs.FS) (_ *Store, err error) {
	s := &Store{path: path, clock: clock, bell: newBell(), reserve: newReserve(path)}
	defer func() {
		if err != nil {
			s.Close(context.WithoutCancel(ctx))
			err = fmt.Errorf("open store %s: %w", path, err)
		}
	}()
	if err := os.MkdirAll(filepath.Dir(path), 0o700); err != nil {
		return nil, fmt.Errorf("%w; choose a state folder that can be written with --state", err)
	}
	if err := ownerOnly(path); err != nil {
		return nil, err
	}
	if s.write, err = connect(path, writerSettings, 1); err != nil {
		return nil, err
	}
	if err := migrate(ctx, s.write, path, steps); err != nil {
		return nil, err
	}
	if s.read, err = connect(path, readerSettings, readers); err != nil {
		return nil, err
	}
	last, err := s.lastSeq(ctx)
	if err != nil {
		return nil, err
	}
	s.bell.ring(last)
	return s, s.reserve.fill()
}

// ownerOnly makes an absent file with mode 0600; SQLite gives its helper files the same.
func ownerOnly(path string) error {
	f, err := os.OpenFile(path, os.O_CREATE|os.O_RDWR, 0o600)
	if err != nil {
		return fmt.Errorf("%w; look at the owner and mode of the state folder and its files", err)
	}
	return f.Close()
}

// OpenReader opens the journal for reading only, beside a daemon that writes
// it or without one. Append, CreateRun and Wait fail with [ErrReadOnly].
func OpenReader(ctx context.Context, path string) (_ *Store, err error) {
	defer func() {
		if err != nil {
			err = fmt.Errorf("open store %s: %w", path, err)
		}
	}()
	if _, err := os.Stat(path); errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%w: no run has been made here yet; name another state folder with --state", ErrNotFound)
	}
	db, err := connect(path, readerSettings, readers)
	if err != nil {
		return nil, err
	}
	if err := sameVersion(ctx, db, migrations.FS); err != nil {
		return nil, errors.Join(err, db.Close())
	}
	return &Store{path: path, clock: instruments.NewClock(1), read: db, bell: newBell()}, nil
}

// connect prepares a pool of connections with the settings given.
func connect(path, settings string, connections int) (*sql.DB, error) {
	abs, err := filepath.Abs(path)
	if err != nil {
		return nil, err
	}
	db, err := sql.Open("sqlite3", (&url.URL{Scheme: "file", Path: abs, RawQuery: settings}).String())
	if err != nil {
		return nil, err
	}
	db.SetMaxOpenConns(connections)
	db.SetMaxIdleConns(connections)
	return db, nil
}

// Close wakes all who wait, then closes readers and writer. It may be called
// twice. The context bounds nothing: SQLite's closing is short.
func (s *Store) Close(context.Context) error {
	s.closing.Do(func() {
		s.bell.close()
		for _, db := range []*sql.DB{s.read, s.write} { // the writer last: it folds the log into the file
			if db != nil {
				s.closed = errors.Join(s.closed, db.Close())
			}
		}
	})
	if s.closed != nil {
		return fmt.Errorf("close store %s: %w", s.path, s.closed)
	}
	return nil
}
