// Command nightbench is the night shift of a small electronics bench: it steps a
// timer-based motor-driver board through a plan, logs what it measures with
// uncertainties, and lets others watch.
package main

import (
	"context"
	"fmt"
	"os"
	"os/signal"
	"syscall"
)

func main() { os.Exit(run(os.Args[1:])) }

// run gives the exit status. The first signal asks to end politely, a second one
// stops waiting for it.
func run(args []string) int {
	ctx, stop := context.WithCancelCause(context.Background())
	last, giveUp := context.WithCancel(context.Background())
	defer giveUp()
	signals := make(chan os.Signal, 2)
	signal.Notify(signals, os.Interrupt, syscall.SIGTERM)
	defer signal.Stop(signals)
	listening := make(chan struct{})
	go func() {
		defer close(listening)
		select {
		case s := <-signals:
			stop(&interrupted{s})
		case <-last.Done():
			return
		}
		select {
		case <-signals:
			fmt.Fprintln(os.Stderr, "nightbench: a second signal: not waiting for off to be confirmed. Switch the supply off at its front panel and look that it is off.")
			giveUp()
		case <-last.Done():
		}
	}()
	err := newRoot(last, args).ExecuteContext(ctx)
	giveUp()
	<-listening
	return report(err)
}
