package store

import (
	"errors"
	"fmt"
	"syscall"

	"github.com/mattn/go-sqlite3"
)

// isFull tells a full disk from other trouble. Growing the shared index of the
// write-ahead log reports it as an I/O error with the system's number.
func isFull(err error) bool {
	var e sqlite3.Error
	return errors.As(err, &e) && (e.Code == sqlite3.ErrFull || e.SystemErrno == syscall.ENOSPC)
}

// isTwice tells whether a unique index refused a row.
func isTwice(err error) bool {
	var e sqlite3.Error
	return errors.As(err, &e) && (e.ExtendedCode == sqlite3.ErrConstraintUnique || e.ExtendedCode == sqlite3.ErrConstraintPrimaryKey)
}

// advise adds what to try to a fault of the disk or the database.
func advise(err error) error {
	var e sqlite3.Error
	switch {
	case err == nil || !errors.As(err, &e):
		return err
	case isFull(err):
		return fmt.Errorf("%w: %w; free some space; every point appended before is safe", ErrFull, err)
	case e.Code == sqlite3.ErrBusy || e.Code == sqlite3.ErrLocked:
		return fmt.Errorf("%w; another program holds the store: is a second daemon running on this state folder?", err)
	case e.Code == sqlite3.ErrReadonly || e.Code == sqlite3.ErrPerm || e.Code == sqlite3.ErrCantOpen:
		return fmt.Errorf("%w; look at the owner and mode of the state folder and its files", err)
	case e.Code == sqlite3.ErrCorrupt || e.Code == sqlite3.ErrNotADB:
		return fmt.Errorf("%w; the file is damaged or no store: keep it, start with another state folder, or restore a backup", err)
	case e.Code == sqlite3.ErrIoErr:
		return fmt.Errorf("%w; look at the disk and the system's log", err)
	case e.Code == sqlite3.ErrConstraint:
		return fmt.Errorf("%w: %w", ErrRefused, err)
	}
	return err
}
