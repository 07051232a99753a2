package main

import (
	"context"
	"errors"
	"fmt"
	"os"

	"nightbench/instruments/userfile"
)

// The exit statuses.
const (
	exitDone        = 0
	exitFailed      = 1
	exitUsage       = 2 // usage or a bad file
	exitTripped     = 4
	exitInterrupted = 130
)

// interrupted is the cause of a context ended by a signal.
type interrupted struct{ signal os.Signal }

func (i *interrupted) Error() string { return "interrupted (" + i.signal.String() + ")" }

// exit is an error with a status of its own.
type exit struct {
	status int
	err    error
}

func (e *exit) Error() string { return e.err.Error() }
func (e *exit) Unwrap() error { return e.err }

func usage(format string, args ...any) error {
	return &exit{exitUsage, fmt.Errorf(format, args...)}
}

// status is the exit status of an error.
func status(err error) int {
	var e *exit
	var bad *userfile.Error
	var sig *interrupted
	switch {
	case err == nil:
		return exitDone
	case errors.As(err, &e):
		return e.status
	case errors.As(err, &bad):
		return exitUsage
	case errors.As(err, &sig):
		return exitInterrupted
	case errors.Is(err, context.Canceled):
		return exitInterrupted
	}
	return exitFailed
}

// report writes the error, once, and gives the exit status.
func report(err error) int {
	if err != nil {
		fmt.Fprintln(os.Stderr, "nightbench:", err)
	}
	return status(err)
}
