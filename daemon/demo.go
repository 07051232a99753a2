package main

import (
	"context"
	"errors"
	"log/slog"
	"path/filepath"
	"strings"

	"nightbench/daemon/app"
	"nightbench/daemon/store"
	"nightbench/daemon/web"
	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/sweeps"
	"nightbench/sweeps/example"

	"github.com/spf13/cobra"
)

// demoOptions are the flags of demo.
type demoOptions struct {
	pace      float64
	seed      uint64
	listen    string
	once      bool
	benchOnly bool
	tcp       bool
	scenario  string
	faults    []string
}

func (c *cli) demo() *cobra.Command {
	var o demoOptions
	cmd := &cobra.Command{
		Use:   "demo",
		Short: "Show it all at work: practice bench, daemon, page, a sample run",
		Long: "demo simulates a dosing-pump driver board and its instruments on pseudo-terminals, holds that\n" +
			"bench like a real one, serves the page on loopback and starts the sample run. Nothing on your\n" +
			"own ports is touched. It keeps its state apart from a real bench's unless --state says otherwise.\n\n" + cautions,
		Args: cobra.NoArgs,
	}
	f := cmd.Flags()
	f.Float64Var(&o.pace, "pace", 20, "how many times as fast as the wall clock bench time runs")
	f.Uint64Var(&o.seed, "seed", 1, "which specimen of the board and which instruments' errors; 0: all parts nominal")
	f.StringVar(&o.listen, "listen", "127.0.0.1:0", "loopback address of the page; port 0 takes any free one")
	f.BoolVar(&o.once, "once", false, "run the sample to its end, print the summary, and end")
	f.BoolVar(&o.benchOnly, "bench-only", false, "serve just the practice bench and print its addresses; hold it with 'serve' from elsewhere")
	f.BoolVar(&o.tcp, "tcp", false, "practice instruments on loopback sockets instead of pseudo-terminals")
	f.StringVar(&o.scenario, "scenario", "", "what is on the bench and what goes wrong: "+strings.Join(app.ScenarioNames(), ", ")+", or a file")
	f.StringArrayVar(&o.faults, "fault", nil, `a fault of the bench, like "late on=average size=4s at=10min"; may be given several times`)
	cmd.RunE = func(cmd *cobra.Command, _ []string) error { return c.runDemo(cmd, o) }
	return cmd
}

func (c *cli) runDemo(cmd *cobra.Command, o demoOptions) error {
	if o.pace < 0.1 || o.pace > 10_000 {
		return usage("--pace %g: give how many times as fast as the wall clock bench time runs, from 0.1 to 10000", o.pace)
	}
	scenario, err := o.read()
	if err != nil {
		return usage("%v", err)
	}
	dir := c.state
	if dir == "" {
		var err error
		if dir, err = app.DefaultState("nightbench-demo"); err != nil {
			return err
		}
	}
	state, err := app.OpenState(dir) // before anything in it is touched: another daemon may be at work there
	if err != nil {
		return err
	}
	defer state.Close()
	files, err := demoFiles(dir)
	if err != nil {
		return err
	}
	clock := instruments.NewClock(o.pace)
	p, benchFile, err := openPractice(cmd.Context(), dir, files, clock, o, scenario)
	if err != nil {
		return err
	}
	defer p.Close()
	for _, a := range p.Addresses {
		say(cmd, "practice %-8s %s", a.Name, a.Address)
	}
	if scenario.Name != "" {
		say(cmd, "scenario: %s, %s", scenario.Name, scenario.About)
	}
	for _, f := range scenario.Faults {
		say(cmd, "fault:    %s", f)
	}
	sayPace(cmd, o.pace)
	say(cmd, "bench file: %s", benchFile)
	if o.benchOnly {
		<-cmd.Context().Done()
		return nil
	}
	if err := app.ForgetPractice(dir); err != nil {
		return err
	}
	file, err := bench.Read(benchFile)
	if err != nil {
		return err
	}
	return c.showRunning(cmd, state, filepath.Join(files, example.Sample), file, clock, o, p)
}

// read reads the scenario and adds the faults of the command line.
func (o demoOptions) read() (s app.Scenario, err error) {
	if o.scenario != "" {
		if s, err = app.ReadScenario(o.scenario); err != nil {
			return s, err
		}
	}
	for _, words := range o.faults {
		f, err := app.ParseFault(words)
		if err != nil {
			return s, err
		}
		s.Faults = append(s.Faults, f)
	}
	return s, nil
}

// openPractice serves the practice bench and writes its bench file.
func openPractice(ctx context.Context, dir, files string, clock instruments.Clock, o demoOptions, scenario app.Scenario) (*app.PracticeBench, string, error) {
	board, err := sweeps.ReadBoard(filepath.Join(files, example.BoardPump))
	if err != nil {
		return nil, "", err
	}
	wired, err := bench.Read(filepath.Join(files, example.Bench))
	if err != nil {
		return nil, "", err
	}
	p, err := app.OpenPractice(ctx, app.PracticeOptions{Board: board, Wiring: wired.Wiring, Clock: clock, Seed: o.seed, TCP: o.tcp, SupplyLog: filepath.Join(dir, "practice-supply.log"),
		Scenario: scenario, Truth: filepath.Join(dir, "practice-truth.json"), Ports: filepath.Join(dir, "ports")})
	if err != nil {
		return nil, "", err
	}
	benchFile, err := p.WriteBench(dir, wired.Text, o.pace)
	if err != nil {
		return nil, "", errors.Join(err, p.Close())
	}
	return p, benchFile, nil
}

// showRunning holds the practice bench, serves the page, and starts the sample run.
func (c *cli) showRunning(cmd *cobra.Command, state *app.State, plan string, file *bench.File, clock instruments.Clock, o demoOptions, p *app.PracticeBench) error {
	ctx, end := context.WithCancelCause(cmd.Context())
	defer end(nil)
	level := slog.LevelInfo
	if o.once {
		level = slog.LevelWarn
	}
	say(cmd, "\n%s\n", cautions)
	result := make(chan error, 1)
	err := app.Serve(ctx, c.last, app.Options{
		Held: state, Bench: app.Given(file), Listen: o.listen, Version: version(), Clock: clock, Log: logger(cmd, level), Practice: p,
		Ready: func(d *app.Daemon, address string) {
			say(cmd, "page, with the operator's token: %s", address)
			run, err := d.Start(ctx, web.StartRequest{Plan: plan, BoardSerial: "0017", Operator: "demo"})
			switch {
			case err != nil:
				end(err)
				result <- err
			case o.once:
				go func() { result <- c.finish(cmd, d, run.ID); end(errOnce) }()
			default:
				say(cmd, "run %d started: %d setpoints. Ctrl-C ends the demo, output off", run.ID, run.Planned)
				result <- nil
			}
		},
	})
	select {
	case r := <-result:
		if r != nil || errors.Is(err, errOnce) {
			return r
		}
	default:
	}
	return err
}

var errOnce = errors.New("the sample run is over")

// finish waits for the run, prints it, and checks the database.
func (c *cli) finish(cmd *cobra.Command, d *app.Daemon, id int64) error {
	run, err := d.Wait(cmd.Context(), id)
	if err != nil {
		return err
	}
	return reading(cmd.Context(), d.StateDir(), func(s *store.Store) error {
		points, err := s.Points(cmd.Context(), id)
		if err != nil {
			return err
		}
		if err := printRun(cmd, run, points); err != nil {
			return err
		}
		if run.State != sweeps.Done {
			return ended(cmd, run)
		}
		say(cmd, "\nrun %d done: %d points, %d flagged; database %s", run.ID, run.Measured, run.Flagged, app.Database(d.StateDir()))
		return nil
	})
}
