package app

import (
	"errors"
	"os"
	"path/filepath"
	"testing"

	"nightbench/instruments"
)

func TestOneDaemonHoldsAStateFolder(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "state")
	s, err := OpenState(dir)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := OpenState(dir); !errors.Is(err, ErrStateHeld) {
		t.Errorf("a second daemon got the folder: %v", err)
	}
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	again, err := OpenState(dir)
	if err != nil {
		t.Fatalf("the folder was not let go: %v", err)
	}
	again.Close()
}

func TestTokenIsMadeOnceAndPrivate(t *testing.T) {
	s, err := OpenState(t.TempDir())
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	a, err := s.Token()
	if err != nil || len(a) < 43 { // 32 bytes in base64url
		t.Fatalf("token %q, %v", a, err)
	}
	if b, _ := s.Token(); b != a {
		t.Error("the token changed")
	}
	info, err := os.Stat(filepath.Join(s.Dir(), "token"))
	if err != nil || info.Mode().Perm() != 0o600 {
		t.Errorf("mode %v, %v; want 0600", info.Mode(), err)
	}
	if err := os.WriteFile(filepath.Join(s.Dir(), "token"), []byte("short"), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := s.Token(); err == nil {
		t.Error("a damaged token file passed")
	}
}

func TestEnergisedRecordOutlivesTheProcess(t *testing.T) {
	dir := t.TempDir()
	if _, there, err := readEnergised(dir); there || err != nil {
		t.Errorf("a record out of nothing: %v %v", there, err)
	}
	m := &mark{path: energisedPath(dir), clock: instruments.NewClock(1), blank: Energised{Address: "serial:///dev/pts/9", Dialect: "standard-supply", Below: 0.5}}
	if err := m.Set(7); err != nil {
		t.Fatal(err)
	}
	e, there, err := readEnergised(dir)
	if err != nil || !there || e.Run != 7 || e.Address != "serial:///dev/pts/9" || e.Below != 0.5 || e.At.IsZero() {
		t.Errorf("read back %+v, %v, %v", e, there, err)
	}
	if err := errors.Join(m.Clear(), m.Clear()); err != nil {
		t.Errorf("clearing: %v", err)
	}
	if _, there, _ := readEnergised(dir); there {
		t.Error("still there after clearing")
	}
	if err := os.WriteFile(energisedPath(dir), []byte("{"), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, there, err := readEnergised(dir); !there || err == nil {
		t.Error("a torn record has to be an error that says what to do by hand")
	}
}
