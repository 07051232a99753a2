package store

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"github.com/pressly/goose/v3"
)

// migrate brings the tables up to the newest step. A store that lags is copied
// first; one that leads is refused.
func migrate(ctx context.Context, db *sql.DB, path string, steps fs.FS) error {
	has, err := version(ctx, db)
	if err != nil {
		return err
	}
	p, err := goose.NewProvider(goose.DialectSQLite3, db, steps)
	if err != nil {
		return fmt.Errorf("migrations: %w", err)
	}
	knows := newest(p)
	switch {
	case has > knows:
		return tooNew(has, knows)
	case has == knows:
		return nil
	case has > 0:
		if err := keepCopy(ctx, db, path, has); err != nil {
			return err
		}
	}
	if _, err := p.Up(ctx); err != nil {
		return fmt.Errorf("bring tables from version %d to %d: %w", has, knows, err)
	}
	return nil
}

// sameVersion is nil when the store's tables are just those this program knows.
func sameVersion(ctx context.Context, db *sql.DB, steps fs.FS) error {
	has, err := version(ctx, db)
	if err != nil {
		return err
	}
	p, err := goose.NewProvider(goose.DialectSQLite3, db, steps)
	if err != nil {
		return fmt.Errorf("migrations: %w", err)
	}
	switch knows := newest(p); {
	case has > knows:
		return tooNew(has, knows)
	case has < knows:
		return fmt.Errorf("%w: its tables are of version %d, this program's of %d; start the daemon once to bring them up", ErrOlder, has, knows)
	}
	return nil
}

func tooNew(has, knows int64) error {
	return fmt.Errorf("%w: its tables are of version %d, this program knows up to %d; use the newer program, or another state folder with --state", ErrNewer, has, knows)
}

func newest(p *goose.Provider) int64 {
	steps := p.ListSources()
	return steps[len(steps)-1].Version
}

// version is the number of the newest step applied; 0 for an empty file.
// A database of someone else's is an error rather than version 0.
func version(ctx context.Context, db *sql.DB) (v int64, err error) {
	var ours, tables int
	q := `SELECT count(*) FILTER (WHERE name = 'goose_db_version'), count(*) FROM sqlite_master WHERE type = 'table'`
	if err := db.QueryRowContext(ctx, q).Scan(&ours, &tables); err != nil {
		return 0, advise(err)
	}
	switch {
	case tables == 0:
		return 0, nil
	case ours == 0:
		return 0, errors.New("this is a database, but not a nightbench store; name another state folder with --state")
	}
	err = db.QueryRowContext(ctx, `SELECT coalesce(max(version_id), 0) FROM goose_db_version WHERE is_applied`).Scan(&v)
	return v, advise(err)
}

// keepCopy lays a copy of the store beside it: nightbench.db.v1 before version 1 is left.
// A copy that is there already is from an upgrade that did not finish: the store is still the same, and it stays.
func keepCopy(ctx context.Context, db *sql.DB, path string, has int64) error {
	to := fmt.Sprintf("%s.v%d", path, has)
	if _, err := os.Stat(to); err == nil {
		return nil
	}
	part := to + ".part"
	if err := os.Remove(part); err != nil && !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	if _, err := db.ExecContext(ctx, `VACUUM INTO ?`, part); err != nil {
		return fmt.Errorf("copy before the upgrade to %s: %w", filepath.Base(to), advise(err))
	}
	return os.Rename(part, to)
}
