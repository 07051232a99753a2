package main

import (
	"cmp"
	"errors"
	"fmt"
	"path/filepath"
	"slices"
	"strings"

	"nightbench/instruments/dialect"

	"github.com/spf13/cobra"
)

// dialects reads the user's own dialects, so that they are found by name and
// by identity. A file with mistakes hinders nobody who does not need it.
func (c *cli) dialects(cmd *cobra.Command, _ []string) error {
	folder := c.dialectFolder
	if folder == "" {
		var err error
		if folder, err = dialect.Folder(); err != nil {
			return nil // without a home there are no own dialects
		}
	}
	for _, err := range dialect.UseFolder(folder) {
		fmt.Fprintf(cmd.ErrOrStderr(), "nightbench: left out: %v\n", err)
	}
	return nil
}

func (c *cli) dialect() *cobra.Command {
	cmd := &cobra.Command{Use: "dialect", Short: "How instrument families are spoken to", Args: cobra.NoArgs}
	cmd.RunE = func(cmd *cobra.Command, _ []string) error { return cmd.Help() }
	cmd.AddCommand(c.dialectList(), c.dialectLint())
	for _, sub := range cmd.Commands() {
		asUsage(sub)
	}
	return cmd
}

func (c *cli) dialectList() *cobra.Command {
	var role string
	cmd := c.withJSON(&cobra.Command{
		Use:   "list [NAME]",
		Short: "List the dialects: family, role, manuals, what is unchecked, what they can't do",
		Args:  cobra.MaximumNArgs(1),
	})
	cmd.Flags().StringVar(&role, "role", "", "only those of one role, like supply")
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		all, err := dialect.All()
		if err != nil {
			return err
		}
		all = slices.DeleteFunc(all, func(d *dialect.Dialect) bool {
			return role != "" && string(d.Head.Role) != role || len(args) == 1 && d.Head.Name != args[0]
		})
		if len(all) == 0 {
			return usage("no such dialect; nightbench dialect list gives them all")
		}
		slices.SortStableFunc(all, byRole)
		if c.json {
			return printJSON(cmd.OutOrStdout(), known(all))
		}
		for _, d := range all {
			describe(cmd, d)
		}
		return nil
	}
	return cmd
}

// byRole sorts supplies first, then as they are used.
func byRole(a, b *dialect.Dialect) int {
	order := []dialect.Role{dialect.RoleSupply, dialect.RoleMeter, dialect.RoleScope, dialect.RolePot, dialect.RoleCutoff, dialect.RoleProbe}
	at := func(d *dialect.Dialect) int {
		if i := slices.Index(order, d.Head.Role); i >= 0 {
			return i
		}
		return len(order)
	}
	return cmp.Or(cmp.Compare(at(a), at(b)), cmp.Compare(a.Head.Role, b.Head.Role), cmp.Compare(a.Head.Name, b.Head.Name))
}

// knownDialect is a dialect as --json prints it.
type knownDialect struct {
	Name      string       `json:"name"`
	Role      dialect.Role `json:"role"`
	About     string       `json:"about"`
	Path      string       `json:"path,omitempty"` // of the user's own
	Manuals   []string     `json:"manuals"`
	Checked   int          `json:"checked"`
	Ours      int          `json:"ours"`
	Unchecked int          `json:"unchecked"`
	Memory    []string     `json:"unchecked_lines"`
	Unproven  []string     `json:"unproven"` // refuse an unattended start
	Cannot    []string     `json:"cannot"`
	Tried     string       `json:"tried"` // empty: never tried on a device
}

func known(all []*dialect.Dialect) (out []knownDialect) {
	for _, d := range all {
		k := knownDialect{Name: d.Head.Name, Role: d.Head.Role, About: d.Head.About, Path: d.Path, Tried: d.Head.Tried,
			Manuals: some(d.Manuals()), Memory: some(d.Unchecked()), Unproven: some(d.Unproven()), Cannot: some(d.Cannot())}
		k.Checked, k.Ours, k.Unchecked = d.Count()
		out = append(out, k)
	}
	return out
}

// some is a list that prints as [] when it is empty.
func some(list []string) []string {
	if list == nil {
		return []string{}
	}
	return list
}

// reached is how a family is reached when nobody changed its settings.
func reached(d *dialect.Dialect) string {
	words := strings.Join(d.Link.Kinds, ", ")
	if d.Link.Line != "" {
		words += "; serial " + d.Link.Line
	}
	if d.Link.Port != 0 {
		words += fmt.Sprintf("; TCP port %d", d.Link.Port)
	}
	return words
}

// limits is what the dialect's limits of error hold for.
func limits(c *dialect.Conditions) string {
	words := []string{c.Interval, c.Temperature}
	if c.WarmUp > 0 {
		words = append(words, "warmed up "+c.WarmUp.String())
	}
	words = append(words, c.Speed)
	return strings.Join(slices.DeleteFunc(words, func(w string) bool { return w == "" }), ", ")
}

// describe prints one dialect in words.
func describe(cmd *cobra.Command, d *dialect.Dialect) {
	say(cmd, "%s  %s: %s", d.Head.Name, d.Head.Role, d.Head.About)
	if d.Path != "" {
		say(cmd, "    your own: %s", d.Path)
	}
	checked, ours, unchecked := d.Count()
	say(cmd, "    %d statements from a manual, %d our own, %d unchecked; %s", checked, ours, unchecked, cmp.Or(d.Head.Tried, "never tried on a device"))
	if words := reached(d); words != "" {
		say(cmd, "    reached by %s", words)
	}
	for _, m := range d.Manuals() {
		say(cmd, "    manual %s", m)
	}
	if d.Conditions != nil {
		say(cmd, "    limits of error: %s", limits(d.Conditions))
	}
	for _, l := range []struct {
		title string
		words []string
	}{
		{"unchecked lines", d.Unchecked()},
		{"unchecked, and refusing an unattended start", d.Unproven()},
		{"can't", d.Cannot()},
	} {
		if len(l.words) > 0 {
			say(cmd, "    %s: %s", l.title, strings.Join(l.words, ", "))
		}
	}
	say(cmd, "")
}

func (c *cli) dialectLint() *cobra.Command {
	cmd := &cobra.Command{Use: "lint FILE", Short: "Check a dialect file of your own", Args: cobra.ExactArgs(1)}
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		d, err := dialect.ReadFile(args[0])
		if err != nil {
			return err
		}
		describe(cmd, d)
		if err := clashes(d); err != nil {
			return &exit{exitUsage, err}
		}
		say(cmd, "%s can be used: dialect = %q in a bench file beside it, or put it into your folder of dialects and name it %q.",
			args[0], filepath.Base(args[0]), d.Head.Name)
		return nil
	}
	return cmd
}

// clashes refuses a name or an identity that another dialect has already.
func clashes(d *dialect.Dialect) error {
	all, err := dialect.All()
	if err != nil {
		return err
	}
	var errs []error
	for _, o := range all {
		if o.Path == d.Path && d.Path != "" {
			continue
		}
		if o.Head.Name == d.Head.Name {
			errs = append(errs, fmt.Errorf("%s: the name %q is taken; give it another", d.Path, d.Head.Name))
		}
		for _, p := range d.Identities {
			for _, q := range o.Identities {
				if p.Maker == q.Maker && p.Model == q.Model && p.Text == q.Text {
					errs = append(errs, fmt.Errorf("%s: the identity %s %s%s is that of %s; auto would have two to choose from", d.Path, p.Maker, p.Model, p.Text, o.Head.Name))
				}
			}
		}
	}
	return errors.Join(errs...)
}
