package main

import (
	"context"
	"fmt"
	"log/slog"
	"runtime/debug"
	"strings"

	"nightbench/daemon/app"

	"github.com/spf13/cobra"
)

// cli is what every command shares.
type cli struct {
	last  context.Context // ends when a second signal came: stop waiting for off to be confirmed
	state string          // --state
	json  bool            // --json

	dialectFolder string // --dialects
}

// cautions are shown at start, on the page and on reports.
var cautions = "Cautions. " + strings.Join(app.Cautions, "\n")

// newRoot is the command with all its subcommands.
func newRoot(last context.Context, args []string) *cobra.Command {
	c := &cli{last: last}
	root := &cobra.Command{
		Use:   "nightbench",
		Short: "The night shift of a small electronics bench",
		Long: "Nightbench steps a timer-based PWM driver board through a plan overnight, logs what it\n" +
			"measures with its uncertainty beside what the schematic predicts, and lets others watch.\n\n" + cautions,
		Version:       version(),
		SilenceUsage:  true,
		SilenceErrors: true,
	}
	root.Args = func(_ *cobra.Command, args []string) error {
		if len(args) > 0 {
			return usage("unknown command %q; 'nightbench --help' lists them", args[0])
		}
		return nil
	}
	root.RunE = func(cmd *cobra.Command, _ []string) error { return cmd.Help() }
	root.SetArgs(args)
	root.SetFlagErrorFunc(func(_ *cobra.Command, err error) error { return usage("%w; see --help", err) })
	root.PersistentFlags().StringVar(&c.state, "state", "", "state folder: database, token, socket (default: nightbench in the XDG state folder)")
	root.PersistentFlags().StringVar(&c.dialectFolder, "dialects", "", "folder of your own dialects (default: nightbench/dialects in the XDG configuration folder)")
	root.PersistentPreRunE = c.dialects
	root.AddCommand(
		c.demo(), c.serve(), c.newFiles(), c.rehearse(), c.start(), c.stop(), c.off(), c.hold(), c.resume(), c.runs(), c.show(), c.predict(), c.pulse(), c.token(),
		c.dialect(), c.ports(), c.ask(),
	)
	for _, sub := range root.Commands() {
		asUsage(sub)
	}
	return root
}

// asUsage makes a wrong number of arguments a usage error.
func asUsage(c *cobra.Command) {
	check := c.Args
	if check == nil {
		return
	}
	c.Args = func(cmd *cobra.Command, args []string) error {
		if err := check(cmd, args); err != nil {
			return usage("%w; write: %s", err, strings.TrimSuffix(cmd.UseLine(), " [flags]"))
		}
		return nil
	}
}

// withJSON adds --json.
func (c *cli) withJSON(cmd *cobra.Command) *cobra.Command {
	cmd.Flags().BoolVar(&c.json, "json", false, "print the result as JSON, SI numbers")
	return cmd
}

// dir is the state folder in force.
func (c *cli) dir() (string, error) {
	if c.state != "" {
		return c.state, nil
	}
	return app.DefaultState("nightbench")
}

// version comes from the build info: a release's module version, else the commit it was built from.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "unknown"
	}
	v, dirty := info.Main.Version, ""
	for _, s := range info.Settings {
		switch {
		case s.Key == "vcs.revision" && (v == "" || v == "(devel)"):
			v = s.Value[:min(12, len(s.Value))]
		case s.Key == "vcs.modified" && s.Value == "true":
			dirty = "+changes"
		}
	}
	if v == "" {
		return "(devel)"
	}
	if v == "(devel)" || len(v) == 12 {
		return v + dirty
	}
	return v
}

func logger(cmd *cobra.Command, level slog.Level) *slog.Logger {
	return slog.New(slog.NewTextHandler(cmd.ErrOrStderr(), &slog.HandlerOptions{Level: level}))
}

func say(cmd *cobra.Command, format string, args ...any) {
	fmt.Fprintf(cmd.OutOrStdout(), format+"\n", args...)
}
