package main

import (
	"path/filepath"

	"nightbench/sweeps/example"

	"github.com/spf13/cobra"
)

func (c *cli) newFiles() *cobra.Command {
	var withExample bool
	cmd := &cobra.Command{
		Use:   "new DIR --example",
		Short: "Write starter files: a bench, two boards, two plans",
		Args:  cobra.ExactArgs(1),
	}
	cmd.Flags().BoolVar(&withExample, "example", false, "write the example set, without questions")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		if !withExample {
			return usage("new: the interview is not part of this version; write: nightbench new %s --example", args[0])
		}
		if err := example.Write(args[0]); err != nil {
			return err
		}
		for _, name := range example.Names() {
			say(cmd, "%s", filepath.Join(args[0], name))
		}
		say(cmd, "\nNext: put your instruments' addresses into bench.toml, then: nightbench rehearse %s/sample.toml", args[0])
		return nil
	}
	return cmd
}
