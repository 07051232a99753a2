package main

import (
	"log/slog"

	"nightbench/daemon/app"
	"nightbench/instruments/bench"

	"github.com/spf13/cobra"
)

func (c *cli) serve() *cobra.Command {
	var listen string
	cmd := &cobra.Command{
		Use:   "serve BENCH",
		Short: "Hold a bench: conduct its runs and serve the page",
		Long: "serve opens the instruments of a bench file, makes the bench safe first where an earlier\n" +
			"daemon left it energised, and then conducts runs and serves the page on loopback until it\n" +
			"is told to end (Ctrl-C, SIGTERM): the open run is stopped and the output confirmed off.\n\n" + cautions,
		Args: cobra.ExactArgs(1),
	}
	cmd.Flags().StringVar(&listen, "listen", "127.0.0.1:8017", "loopback address of the page; port 0 takes any free one")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		dir, err := c.dir()
		if err != nil {
			return err
		}
		say(cmd, "%s\n", cautions)
		return app.Serve(cmd.Context(), c.last, app.Options{
			State: dir, Listen: listen, Version: version(), Log: logger(cmd, slog.LevelInfo),
			Bench: func() (*bench.File, error) { return bench.Read(args[0]) },
			Ready: func(d *app.Daemon, address string) {
				say(cmd, "bench %q is held; state in %s", d.Bench().Wiring.Bench, dir)
				sayPace(cmd, d.Pace())
				say(cmd, "page, with the operator's token: %s", address)
			},
		})
	}
	return cmd
}

// sayPace says so when bench time runs faster than the wall.
func sayPace(cmd *cobra.Command, pace float64) {
	if pace != 1 {
		say(cmd, "practice bench at %g times the speed of the wall clock", pace)
	}
}
