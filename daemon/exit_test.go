package main

import (
	"context"
	"errors"
	"fmt"
	"syscall"
	"testing"

	"nightbench/instruments/userfile"
)

func TestExitStatuses(t *testing.T) {
	for want, errs := range map[int][]error{
		exitDone:        {nil},
		exitFailed:      {errors.New("a cable")},
		exitUsage:       {usage("wrong"), &userfile.Error{File: "x"}, fmt.Errorf("bench: %w", userfile.Errors{{File: "x"}})},
		exitTripped:     {&exit{exitTripped, errors.New("tripped")}},
		exitInterrupted: {&interrupted{syscall.SIGINT}, fmt.Errorf("waiting: %w", context.Canceled)},
	} {
		for _, err := range errs {
			if got := status(err); got != want {
				t.Errorf("status of %v is %d, want %d", err, got, want)
			}
		}
	}
	for _, args := range [][]string{{"frobnicate"}, {"predict"}, {"runs", "--no-such-flag"}, {"show", "one"}} {
		if got := status(newRoot(t.Context(), args).ExecuteContext(t.Context())); got != exitUsage {
			t.Errorf("nightbench %v has status %d, want %d", args, got, exitUsage)
		}
	}
}
