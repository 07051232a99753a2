package store

import (
	"crypto/rand"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

// reserveSize holds the last words of a night many times over: an entry of
// words dirties about four pages of 4 KiB, and the write-ahead log needs them once more.
const reserveSize = 1 << 20

// reserve is disk space held back beside the store, given up when the disk is
// full so that "off" and "ended" can still be written.
type reserve struct {
	path string
	free func() error // gives the space up
}

func newReserve(store string) *reserve {
	path := filepath.Join(filepath.Dir(store), filepath.Base(store)+".reserve")
	return &reserve{path: path, free: func() error { return os.Remove(path) }}
}

// fill writes the reserve anew where it is missing or short. The bytes are
// written, not merely declared, and random: a sparse file reserves nothing, nor
// does one of zeros where the file system compresses.
func (r *reserve) fill() error {
	if i, err := os.Stat(r.path); err == nil && i.Size() == reserveSize {
		return nil
	}
	f, err := os.OpenFile(r.path, os.O_CREATE|os.O_WRONLY|os.O_TRUNC, 0o600)
	if err != nil {
		return fmt.Errorf("reserve for the last words: %w", err)
	}
	noise := make([]byte, reserveSize)
	rand.Read(noise) // never fails
	_, err = f.Write(noise)
	if err := errors.Join(err, f.Sync(), f.Close()); err != nil {
		return fmt.Errorf("reserve of %d KiB for the last words: %w; free some space first", reserveSize>>10, err)
	}
	return nil
}

// release gives the space up; false when there is none left to give.
func (r *reserve) release() (bool, error) {
	err := r.free()
	if errors.Is(err, fs.ErrNotExist) {
		return false, nil
	}
	return err == nil, err
}
