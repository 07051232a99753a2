package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"strings"

	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
)

// asking is a talk with one instrument, a line at a time.
type asking struct {
	conn    *scpi.Conn
	link    *link.Link
	out     io.Writer
	plain   bool // send and read back, prove nothing, ask for no errors
	noQueue bool // it has no error queue, or none that answers
	said    []string
}

// mostBlock is the largest block taken, bytes.
const mostBlock = 64 << 20

const askHelp = `a line with ? is a query and its reply is shown, any other a command; then the error queue is read and shown.
  .history    what was typed          .errors    the error queue now
  .clear      device clear            .identify  who answers
  .help       this                    .quit      the end (or Ctrl-D)`

// line carries out one typed line; quit ends the session. A failure that another
// line may mend is shown; a lost link is an error.
func (a *asking) line(ctx context.Context, text string) (quit bool, err error) {
	text = strings.TrimSpace(text)
	if text == "" {
		return false, nil
	}
	a.said = append(a.said, text)
	switch text {
	case ".quit", ".exit":
		return true, nil
	case ".help":
		fmt.Fprintln(a.out, askHelp)
	case ".history":
		for n, s := range a.said {
			fmt.Fprintf(a.out, "%4d  %s\n", n+1, s)
		}
	case ".errors":
		err = a.errors(ctx)
	case ".clear":
		err = a.link.Clear(ctx)
	case ".identify":
		err = a.identify(ctx)
	default:
		if text[0] == '.' {
			fmt.Fprintf(a.out, "no such word as %s\n%s\n", text, askHelp)
			return false, nil
		}
		err = a.say(ctx, text)
	}
	return false, err
}

func (a *asking) identify(ctx context.Context) error {
	id, err := a.conn.Identify(ctx)
	if err == nil {
		fmt.Fprintln(a.out, id.Raw)
	}
	return err
}

// say sends what was typed, shows its reply and then the error queue, since a
// header that is not known has no reply but an error.
func (a *asking) say(ctx context.Context, text string) error {
	err := a.exchange(ctx, text)
	if a.plain || a.noQueue || errors.Is(err, link.ErrLost) || errors.Is(err, scpi.ErrMessage) {
		return err
	}
	return errors.Join(err, a.errors(ctx))
}

func (a *asking) exchange(ctx context.Context, text string) error {
	query := strings.Contains(text, "?")
	switch {
	case a.plain && query:
		reply, err := a.link.Query(ctx, text)
		if err == nil {
			fmt.Fprintln(a.out, reply)
		}
		return err
	case a.plain:
		return a.link.Send(ctx, text)
	case !query:
		return a.conn.Write(ctx, text)
	}
	r, err := a.conn.QueryAny(ctx, text, mostBlock)
	if err == nil {
		fmt.Fprintln(a.out, summary(r))
	}
	return err
}

// errors shows the error queue; nothing is said of an empty one.
func (a *asking) errors(ctx context.Context) error {
	faults, err := a.conn.Errors(ctx)
	for _, f := range faults {
		fmt.Fprintf(a.out, "error %v\n", f)
	}
	if errors.Is(err, link.ErrTimeout) && len(faults) == 0 {
		a.noQueue = true
		fmt.Fprintln(a.out, "its error queue does not answer and is not asked again; name its dialect with --dialect, or ask plainly with --plain")
		return nil
	}
	return err
}

// summary is a reply for a person: a line as it is, a block by its size, its
// first bytes and its extremes, byte by byte.
func summary(r scpi.Reply) string {
	if r.Block == nil {
		return r.Text
	}
	if len(r.Block) == 0 {
		return "block of 0 bytes"
	}
	low, high := r.Block[0], r.Block[0]
	for _, b := range r.Block {
		low, high = min(low, b), max(high, b)
	}
	more := ""
	if len(r.Block) > 16 {
		more = " …"
	}
	return fmt.Sprintf("block of %d bytes: % x%s (each from %d to %d)", len(r.Block), r.Block[:min(len(r.Block), 16)], more, low, high)
}
