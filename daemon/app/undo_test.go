package app

import (
	"context"
	"errors"
	"strings"
	"testing"
)

func TestUndoGoesLastFirstWhateverFails(t *testing.T) {
	var u undo
	var did []string
	for _, name := range []string{"a", "b", "c"} {
		u.add(name, func(context.Context) error {
			did = append(did, name)
			if name != "a" {
				return errors.New("stuck")
			}
			return nil
		})
	}
	err := u.all(t.Context())
	if got := strings.Join(did, ""); got != "cba" {
		t.Errorf("undone in the order %q, want cba", got)
	}
	if err == nil || !strings.Contains(err.Error(), "closing c: stuck") || !strings.Contains(err.Error(), "closing b: stuck") {
		t.Errorf("errors lost: %v", err)
	}
	if u.all(t.Context()) != nil || len(did) != 3 {
		t.Error("a second undoing did something")
	}
}
