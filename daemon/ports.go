package main

import (
	"context"
	"fmt"
	"io"
	"strings"
	"sync"
	"time"

	"nightbench/daemon/service"
	"nightbench/instruments/bench"
	"nightbench/instruments/dialect"
	"nightbench/instruments/discover"
	"nightbench/instruments/link"

	"github.com/spf13/cobra"
)

// portsOptions are the flags of ports.
type portsOptions struct {
	ask, network, udev bool
	at                 []string
	dialect            string
}

func (c *cli) ports() *cobra.Command {
	var o portsOptions
	cmd := c.withJSON(&cobra.Command{
		Use:   "ports",
		Short: "What is plugged in, by the name that stays, and what announces itself on the network",
		Long: "Lists serial lines and USB instruments by the address to write into a bench file.\n\n" +
			"What an unknown device is sent: listing opens and sends nothing. With --network one multicast\n" +
			"question goes out for _scpi-raw._tcp and _lxi._tcp. With --ask each address listed is opened,\n" +
			"which raises DTR and RTS on a serial line and so resets some microcontroller boards; *IDN? is sent\n" +
			"twice, and nothing else. Give serial settings other than 9600 8N1 with the address (--at) or the dialect.",
		Args: cobra.NoArgs,
	})
	f := cmd.Flags()
	f.BoolVar(&o.ask, "ask", false, "ask each who it is, and suggest dialect and lines of a bench file")
	f.BoolVar(&o.network, "network", false, "look for instruments that announce themselves on this network (2 s)")
	f.StringArrayVar(&o.at, "at", nil, "an address to list as well, such as tcp://192.0.2.10:5025; may be repeated; alone it is the only one listed")
	f.StringVar(&o.dialect, "dialect", "", "use this dialect's serial settings where an address gives none")
	f.BoolVar(&o.udev, "udev", false, "print a udev rule for each USB device and do nothing else")
	cmd.RunE = func(cmd *cobra.Command, _ []string) error {
		found, err := find(cmd.Context(), o)
		if err != nil {
			return err
		}
		if o.udev {
			return printRules(cmd.OutOrStdout(), found)
		}
		if o.ask {
			askAll(cmd.Context(), found)
		}
		if c.json {
			return printJSON(cmd.OutOrStdout(), found)
		}
		return printFound(cmd.OutOrStdout(), found, o)
	}
	return cmd
}

// networkWait is how long answers from the network are gathered.
const networkWait = 2 * time.Second

func find(ctx context.Context, o portsOptions) (found []discover.Found, err error) {
	if len(o.at) == 0 || o.udev {
		if found, err = discover.Plugged("/"); err != nil {
			return nil, err
		}
	}
	for _, text := range o.at {
		if _, err := link.Parse(text); err != nil {
			return nil, &exit{exitUsage, err}
		}
		found = append(found, discover.Found{Address: text, Words: "given"})
	}
	if o.network {
		more, err := discover.Announced(ctx, discover.MulticastDNS, networkWait)
		if err != nil {
			return nil, err
		}
		found = append(found, more...)
	}
	d, err := anyDialect(o.dialect)
	if err != nil {
		return nil, &exit{exitUsage, err}
	}
	return found, withSettings(found, d)
}

// withSettings adds a dialect's serial settings to the addresses that give none.
func withSettings(found []discover.Found, d *dialect.Dialect) error {
	for n := range found {
		if d == nil {
			break
		}
		a, err := link.Parse(found[n].Address)
		if err == nil {
			a, err = bench.WithUsualLine(a, d)
		}
		if err != nil {
			return err
		}
		found[n].Address = a.String()
	}
	return nil
}

// askAll asks all side by side, since some will not answer.
func askAll(ctx context.Context, found []discover.Found) {
	var all sync.WaitGroup
	for n := range found {
		all.Go(func() { discover.Ask(ctx, &found[n], nil) })
	}
	all.Wait()
}

func printRules(w io.Writer, found []discover.Found) error {
	fmt.Fprint(w, service.UdevRules)
	for _, f := range found {
		if rule := discover.Rule(f); rule != "" {
			fmt.Fprint(w, "\n", rule)
		}
	}
	return nil
}

func printFound(w io.Writer, found []discover.Found, o portsOptions) error {
	if len(found) == 0 {
		fmt.Fprintln(w, "nothing is plugged in that could be an instrument; --network looks for those that announce themselves, --at ADDRESS lists one you know")
	}
	for _, f := range found {
		fmt.Fprintf(w, "%s\n    %s\n", f.Address, f.Words)
		if f.Identity != nil {
			fmt.Fprintf(w, "    answers %s\n", f.Identity.Raw)
		}
		if f.Trouble != "" {
			fmt.Fprintf(w, "    %s\n", f.Trouble)
		}
		if len(f.Lines) > 0 {
			fmt.Fprintf(w, "    for a bench file:\n        %s\n", strings.Join(f.Lines, "\n        "))
		}
	}
	if len(found) > 0 && !o.ask {
		fmt.Fprintln(w, "\nnobody was asked who they are; --ask does that (*IDN?, twice)")
	}
	return nil
}
