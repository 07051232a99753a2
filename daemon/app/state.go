// Package app is the daemon's life: it opens things in order, registers the
// undoing of each at once, conducts runs, and stops last-first in a fresh,
// bounded context.
package app

import (
	"crypto/rand"
	"encoding/base64"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"syscall"
)

// State is the folder that holds a daemon's database, token, socket and the
// record of what is energised. One daemon at a time holds it.
type State struct {
	dir  string
	lock *os.File
}

// DefaultState is the state folder of the XDG base directories, for a name such as "nightbench".
func DefaultState(name string) (string, error) {
	if dir := os.Getenv("XDG_STATE_HOME"); filepath.IsAbs(dir) {
		return filepath.Join(dir, name), nil
	}
	home, err := os.UserHomeDir()
	if err != nil {
		return "", fmt.Errorf("no state folder: %w; name one with --state DIR", err)
	}
	return filepath.Join(home, ".local", "state", name), nil
}

// ErrStateHeld says that another daemon holds the state folder.
var ErrStateHeld = errors.New("another nightbench holds this state folder")

// OpenState makes the folder where it is missing and holds it for this process.
func OpenState(dir string) (*State, error) {
	if err := os.MkdirAll(dir, 0o700); err != nil {
		return nil, fmt.Errorf("state folder: %w; name another with --state DIR", err)
	}
	f, err := os.OpenFile(filepath.Join(dir, "lock"), os.O_CREATE|os.O_RDWR, 0o600)
	if err != nil {
		return nil, fmt.Errorf("state folder: %w", err)
	}
	if err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB); err != nil {
		f.Close()
		return nil, fmt.Errorf("%w (%s): end it first, or name another with --state DIR", ErrStateHeld, dir)
	}
	return &State{dir: dir, lock: f}, nil
}

// Close lets the folder go.
func (s *State) Close() error { return s.lock.Close() }

// Dir is the folder.
func (s *State) Dir() string { return s.dir }

// Database is the journal's file in a state folder.
func Database(dir string) string { return filepath.Join(dir, "nightbench.db") }

// Socket is the daemon's socket in a state folder; whoever may open it may control.
func Socket(dir string) string { return filepath.Join(dir, "nightbench.sock") }

// ReadToken is the operator's token of a state folder; an error says how it comes about.
func ReadToken(dir string) (string, error) {
	path := filepath.Join(dir, "token")
	b, err := os.ReadFile(path)
	if errors.Is(err, os.ErrNotExist) {
		return "", fmt.Errorf("no token in %s: a daemon makes it at its first start ('nightbench serve BENCH'); name another state folder with --state DIR: %w", dir, err)
	}
	if err != nil {
		return "", fmt.Errorf("operator's token: %w", err)
	}
	if t := strings.TrimSpace(string(b)); len(t) >= 32 {
		return t, nil
	}
	return "", fmt.Errorf("%s is no token: delete it and a new one is made", path)
}

// Token is the operator's token, made on first use: 32 random bytes, readable by the owner only.
func (s *State) Token() (string, error) {
	t, err := ReadToken(s.dir)
	if !errors.Is(err, os.ErrNotExist) {
		return t, err
	}
	var raw [32]byte
	if _, err := rand.Read(raw[:]); err != nil {
		return "", fmt.Errorf("operator's token: %w", err)
	}
	t = base64.RawURLEncoding.EncodeToString(raw[:])
	if err := writeDurably(filepath.Join(s.dir, "token"), []byte(t+"\n")); err != nil {
		return "", fmt.Errorf("operator's token: %w", err)
	}
	return t, nil
}

// writeDurably writes a small file so that it is there, whole, after a power cut:
// a new file, synced, renamed over the old one, the folder synced.
func writeDurably(path string, data []byte) error {
	tmp := path + ".new"
	f, err := os.OpenFile(tmp, os.O_CREATE|os.O_WRONLY|os.O_TRUNC, 0o600)
	if err != nil {
		return err
	}
	_, err = f.Write(data)
	err = errors.Join(err, f.Sync(), f.Close())
	if err == nil {
		err = os.Rename(tmp, path)
	}
	if err != nil {
		return errors.Join(err, os.Remove(tmp))
	}
	return syncDir(filepath.Dir(path))
}

// removeDurably removes a file so that it stays away after a power cut; a missing one is fine.
func removeDurably(path string) error {
	if err := os.Remove(path); err != nil && !errors.Is(err, os.ErrNotExist) {
		return err
	}
	return syncDir(filepath.Dir(path))
}

func syncDir(dir string) error {
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	return errors.Join(d.Sync(), d.Close())
}
