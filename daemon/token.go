package main

import (
	"nightbench/daemon/app"

	"github.com/spf13/cobra"
)

func (c *cli) token() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "token",
		Short: "Print the operator's token of a state folder",
		Long:  "Whoever has the token may control the bench from the page: open its address with #token=… behind it. Without it the page only watches.",
		Args:  cobra.NoArgs,
	}
	cmd.RunE = func(cmd *cobra.Command, _ []string) error {
		dir, err := c.dir()
		if err != nil {
			return err
		}
		t, err := app.ReadToken(dir)
		if err == nil {
			say(cmd, "%s", t)
		}
		return err
	}
	return cmd
}
