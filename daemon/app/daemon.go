package app

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"net/http"
	"sync"
	"time"

	"nightbench/daemon/store"
	"nightbench/daemon/web"
	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/sweeps"
	"nightbench/ui"
)

// Cautions are shown at start, on the page and on reports.
var Cautions = []string{
	"Switching off by software is no emergency stop: keep the mains switch within reach.",
	"Secure and guard the motor; a dry pump overheats; nothing flammable near.",
	"Fit the inline fuse; mind polarity, the scope's earth and coast-down.",
	"Local rules and licensed practice come first.",
}

// Options are what a daemon is started with.
type Options struct {
	State   string                      // folder; not looked at where Held is given
	Held    *State                      // the folder held by the caller, who lets it go after Serve; nil: Serve holds State
	Bench   func() (*bench.File, error) // reads and checks the bench file, once the bench is known to be safe
	Listen  string                      // loopback address, port 0 for any free one
	Version string
	Clock   instruments.Clock // nil: one of the bench file's pace; a practice bench in this process shares its own
	Log     *slog.Logger
	// Practice is the practice bench when it runs in this process: faults can then be brought about over the API.
	Practice *PracticeBench
	// Ready is called once, when the page can be opened; address is its URL with the operator's token.
	Ready func(d *Daemon, address string)
}

// Budgets for closing, wall time.
const (
	closeBudget = 20 * time.Second
	webBudget   = 3 * time.Second
)

// Below is the voltage under which a read-back output counts as off, V. Common
// practice, no source: half a volt turns no timer and no small motor.
const Below = 0.5

// Daemon holds one bench and conducts its runs, one at a time.
type Daemon struct {
	o     Options
	clock instruments.Clock
	state *State
	store *store.Store
	file  *bench.File
	bench *bench.Opened
	mark  *mark
	first *sweeps.Off // what making safe at the start found; nil: nothing was left energised

	answers answers
	begun   time.Time
	last    context.Context         // ends when nobody will wait for off any longer
	fail    context.CancelCauseFunc // ends the daemon: it can't go on

	idling     context.Context // of what goes on while no run is open
	stopIdling context.CancelFunc
	behind     sync.WaitGroup

	mu       sync.Mutex // guards what follows; never held over I/O
	run      *active
	idle     sweeps.Vitals // while no run is open
	doubted  bool          // Outputs off was not confirmed: only another one clears that
	trying   bool          // somebody goes on making safe
	offs     int           // how often Outputs off was pressed
	starting bool          // a run is being started
	ending   bool
}

// Serve opens everything in order, safety first, serves until ctx ends, and
// closes everything last-first. last ends when a person no longer waits for off
// to be confirmed.
func Serve(ctx, last context.Context, o Options) (err error) {
	d := &Daemon{o: o, clock: o.Clock, last: last}
	var u undo
	defer func() {
		ctx, cancel := context.WithTimeout(context.Background(), closeBudget)
		defer cancel()
		err = errors.Join(err, u.all(ctx))
	}()
	told := ctx
	ctx, d.fail = context.WithCancelCause(ctx)
	defer d.fail(nil)
	if err := d.open(ctx, &u); err != nil {
		return err
	}
	<-ctx.Done()
	err = d.end(context.Cause(ctx))
	if err == nil && told.Err() == nil {
		err = context.Cause(ctx) // nobody told it to end
	}
	return err
}

// nearby refuses an address of the page that other computers could reach, before anything is opened.
func nearby(listen string) error {
	host, _, err := net.SplitHostPort(listen)
	if err != nil {
		return fmt.Errorf("the page's address %q: %w; write it like 127.0.0.1:8017", listen, err)
	}
	if ip := net.ParseIP(host); host != "localhost" && (ip == nil || !ip.IsLoopback()) {
		return fmt.Errorf("the page's address %q: only loopback is served by this version, like 127.0.0.1:8017; to watch from elsewhere forward that port by SSH", listen)
	}
	return nil
}

// open is the order of opening. Each step registers its undoing at once.
func (d *Daemon) open(ctx context.Context, u *undo) (err error) {
	if d.state = d.o.Held; d.state == nil {
		if d.state, err = OpenState(d.o.State); err != nil {
			return err
		}
		u.add("the state folder", func(context.Context) error { return d.state.Close() })
	}
	if err := d.safeFirst(ctx); err != nil {
		return err
	}
	if err := d.readBench(); err != nil {
		return err
	}
	if d.store, err = store.Open(ctx, Database(d.state.Dir()), d.clock); err != nil {
		return err
	}
	u.add("the store", d.store.Close)
	if err := d.closeInterrupted(ctx); err != nil {
		return err
	}
	opening := bench.Options{Clock: d.clock, Exchange: d.answers.hear, Log: func(words string) { d.o.Log.Info(words) }}
	if d.bench, err = bench.Open(ctx, d.file, opening); err != nil {
		return err
	}
	u.add("the bench", d.bench.Close)
	d.answers.expect(d.bench.Info)
	d.mark.blank.Dialect = d.bench.Info[0].From
	d.foundOn(ctx)
	d.idling, d.stopIdling = context.WithCancel(context.WithoutCancel(ctx))
	d.behind.Go(func() { d.watchIdle(d.idling) })
	u.add("what goes on while no run is open", func(context.Context) error { d.stopIdling(); d.behind.Wait(); return nil })
	return d.openPage(ctx, u)
}

// openPage serves API and page on loopback and on the socket of the state folder.
func (d *Daemon) openPage(ctx context.Context, u *undo) error {
	token, err := d.state.Token()
	if err != nil {
		return err
	}
	tcp, err := net.Listen("tcp", d.o.Listen)
	if err != nil {
		return fmt.Errorf("the page's address: %w; choose another with --listen, port 0 takes any free one", err)
	}
	o := web.Options{Store: d.store, Control: d, Predict: newBoards(d.store), Page: ui.Page(), Token: token, Version: d.o.Version, Cautions: Cautions, Clock: d.clock, Log: d.o.Log}
	if d.o.Practice != nil {
		o.Practice = practiceWeb{d.o.Practice.Bench}
	}
	srv := web.New(o)
	local, err := web.ListenSocket(Socket(d.state.Dir()))
	if err != nil {
		return errors.Join(err, tcp.Close())
	}
	serving, stop := context.WithCancel(context.WithoutCancel(ctx))
	done := make(chan error, 1)
	go func() {
		err := ignoreClosed(srv.Serve(serving, tcp, local))
		if err != nil && serving.Err() == nil {
			// Nobody could reach the bench any more: the run ends, the bench is made safe.
			d.fail(fmt.Errorf("the page's server: %w", err))
		}
		done <- err
	}()
	u.add("the page", func(context.Context) error { stop(); return <-done })
	if d.o.Ready != nil {
		d.o.Ready(d, fmt.Sprintf("http://%s/#token=%s", tcp.Addr(), token))
	}
	return nil
}

func ignoreClosed(err error) error {
	if errors.Is(err, http.ErrServerClosed) || errors.Is(err, net.ErrClosed) {
		return nil
	}
	return err
}

// Given is a bench file that was read already.
func Given(f *bench.File) func() (*bench.File, error) {
	return func() (*bench.File, error) { return f, nil }
}

// Pace is how many times as fast as the wall bench time runs.
func (d *Daemon) Pace() float64 { return d.clock.Pace() }

// StateDir is the daemon's state folder.
func (d *Daemon) StateDir() string { return d.state.Dir() }

// readBench reads what the daemon is started with. It comes after the making safe: a
// mistake in a file never leaves a bench energised.
func (d *Daemon) readBench() (err error) {
	if err := nearby(d.o.Listen); err != nil {
		return err
	}
	if d.file, err = d.o.Bench(); err != nil {
		return err
	}
	if d.clock == nil {
		d.clock = instruments.NewClock(d.file.Pace)
	}
	d.begun = d.clock.Now()
	d.mark = d.newMark()
	return nil
}

// newMark makes the energised record's keeper: it names the supply, so that a later start can switch it off with nothing else at hand.
func (d *Daemon) newMark() *mark {
	f := d.file
	return &mark{path: energisedPath(d.state.Dir()), clock: d.clock, blank: Energised{
		Bench: f.Wiring.Bench, Address: f.Supply.Address.String(), Dialect: f.Supply.Dialect, Channel: f.Supply.Channel, Pace: f.Pace, Practice: f.Wiring.Practice, Below: Below,
	}}
}
