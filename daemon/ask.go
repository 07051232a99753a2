package main

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"net/http"
	"os"
	"time"

	"nightbench/daemon/web"
	"nightbench/instruments/bench"
	"nightbench/instruments/dialect"
	"nightbench/instruments/link"
	"nightbench/instruments/link/exchange"

	"github.com/spf13/cobra"
	"golang.org/x/term"
)

// askOptions are the flags of ask.
type askOptions struct {
	dialect string
	record  string
	timeout time.Duration
	plain   bool
}

func (c *cli) ask() *cobra.Command {
	var o askOptions
	cmd := &cobra.Command{
		Use:   "ask ADDRESS ['QUERY']",
		Short: "Ask one instrument one thing, or talk to it line by line",
		Long: "Sends what you type to one instrument and shows what it answers, its error queue after it.\n" +
			"Before the first line *IDN? and *OPC? are sent, to prove that replies belong to their questions;\n" +
			"with --plain nothing is sent but what you type.\n" +
			"It sends whatever you type, output on included: look that nobody is at the board.\n\n" + cautions,
		Args: cobra.RangeArgs(1, 2),
	}
	cmd.Flags().StringVar(&o.dialect, "dialect", "", "its dialect, or the path of a file of your own: line settings, terminators, error query (default: the usual ones)")
	cmd.Flags().StringVar(&o.record, "record", "", "write the exchange to this file, which tests can play back")
	cmd.Flags().DurationVar(&o.timeout, "timeout", 0, "time allowed for one reply (default: the dialect's)")
	cmd.Flags().BoolVar(&o.plain, "plain", false, "send only what is typed: no proof of being in step, no error queue")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		a, err := link.Parse(args[0])
		if err != nil {
			return &exit{exitUsage, err}
		}
		if err := c.notHeld(cmd.Context(), a); err != nil {
			return err
		}
		return runAsk(cmd, a, o, args[1:])
	}
	return cmd
}

// notHeld refuses an instrument that a running daemon holds: a line from
// outside between its exchanges could spoil a run.
func (c *cli) notHeld(ctx context.Context, a link.Address) error {
	dir, err := c.dir()
	if err != nil {
		return err
	}
	var held web.Bench
	ctx, cancel := context.WithTimeout(ctx, 2*time.Second)
	defer cancel()
	if newClient(dir).do(ctx, http.MethodGet, "/api/bench", nil, &held) != nil {
		return nil // no daemon, or none that holds a bench
	}
	for _, i := range held.Instruments {
		if other, err := link.Parse(i.Address); err == nil && other.Canonical() == a.Canonical() {
			return fmt.Errorf("the daemon in %s holds %s as its %s; end it first, or look at the Bench view of its page", dir, a, i.Name)
		}
	}
	return nil
}

func runAsk(cmd *cobra.Command, a link.Address, o askOptions, query []string) (err error) {
	d, err := anyDialect(o.dialect)
	if err != nil {
		return &exit{exitUsage, err}
	}
	var opt bench.Options
	if o.record != "" {
		f, err := os.Create(o.record)
		if err != nil {
			return err
		}
		log := exchange.NewLog(f, a.String())
		opt.Trace = log.Trace
		defer func() { err = errors.Join(err, log.Close(), f.Close()) }()
	}
	l, conn, err := bench.Connect(cmd.Context(), a, d, opt)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, l.Close()) }()
	if o.timeout > 0 {
		conn = conn.Within(o.timeout)
	}
	s := &asking{conn: conn, link: l, out: cmd.OutOrStdout(), plain: o.plain, noQueue: d != nil && d.Errors.Form == "none"}
	if len(query) == 1 {
		_, err := s.line(cmd.Context(), query[0])
		return err
	}
	return converse(cmd.Context(), s, cmd.InOrStdin())
}

// anyDialect finds a dialect of any role; nil when none is named.
func anyDialect(name string) (d *dialect.Dialect, err error) {
	if name == "" {
		return nil, nil
	}
	for _, role := range []dialect.Role{dialect.RoleSupply, dialect.RoleMeter, dialect.RoleScope, dialect.RolePot} {
		if d, err = dialect.Find(role, name); err == nil {
			return d, nil
		}
	}
	return nil, err
}

// converse carries out line by line until the end of what is typed. On a
// terminal lines can be edited, and the arrow keys bring earlier ones back.
func converse(ctx context.Context, s *asking, in io.Reader) error {
	next, restore, err := reader(s, in)
	if err != nil {
		return err
	}
	defer restore()
	type typed struct {
		text string
		err  error
	}
	lines := make(chan typed)
	go func() { // ends with its input, or with the program
		for {
			text, err := next()
			select {
			case lines <- typed{text, err}:
			case <-ctx.Done():
				return
			}
			if err != nil {
				return
			}
		}
	}()
	for {
		select {
		case <-ctx.Done():
			return context.Cause(ctx)
		case t := <-lines:
			if errors.Is(t.err, io.EOF) {
				return nil
			}
			if t.err != nil {
				return t.err
			}
			quit, err := s.line(ctx, t.text)
			if quit || ctx.Err() != nil {
				return context.Cause(ctx)
			}
			if err != nil {
				fmt.Fprintf(s.out, "%v\n", err)
			}
		}
	}
}

// reader gives the next typed line: through an editor on a terminal.
func reader(s *asking, in io.Reader) (next func() (string, error), restore func(), err error) {
	f, ok := in.(*os.File)
	if !ok || !term.IsTerminal(int(f.Fd())) {
		lines := bufio.NewScanner(in)
		return func() (string, error) {
			if !lines.Scan() {
				return "", errors.Join(lines.Err(), io.EOF)
			}
			return lines.Text(), nil
		}, func() {}, nil
	}
	before, err := term.MakeRaw(int(f.Fd()))
	if err != nil {
		return nil, nil, err
	}
	t := term.NewTerminal(struct {
		io.Reader
		io.Writer
	}{f, s.out}, "> ")
	s.out = t
	fmt.Fprintln(t, ".help says what can be typed")
	return t.ReadLine, func() { term.Restore(int(f.Fd()), before) }, nil
}
