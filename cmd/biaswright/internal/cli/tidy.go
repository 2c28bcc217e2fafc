package cli

import (
	"bytes"
	"fmt"

	"github.com/urfave/cli/v2"

	"biaswright/netlist/syntax"
)

func (r *runner) tidyCommand() *cli.Command {
	return &cli.Command{
		Name:      "tidy",
		Usage:     "print a file in its canonical form, comments kept",
		UsageText: "biaswright tidy [--check | --write] FILE...",
		Flags: []cli.Flag{
			&cli.BoolFlag{Name: "check", Usage: "print nothing but the names of files that differ from their canonical form, and exit 1 if any does", DisableDefaultText: true},
			&cli.BoolFlag{Name: "write", Usage: "rewrite each file that differs", DisableDefaultText: true},
		},
		Action: r.tidy,
	}
}

func (r *runner) tidy(c *cli.Context) error {
	check, write := c.Bool("check"), c.Bool("write")
	if c.NArg() == 0 {
		return &usageError{"tidy needs a file", `"-" is standard input`}
	}
	if check && write {
		return usagef("--check and --write exclude each other")
	}
	for _, name := range c.Args().Slice() {
		if write && name == standardInput {
			return usagef("standard input cannot be rewritten")
		}
	}
	for _, name := range c.Args().Slice() {
		if err := r.tidyFile(name, check, write); err != nil {
			return err
		}
	}
	return nil
}

func (r *runner) tidyFile(name string, check, write bool) error {
	text, err := r.read(name)
	if err != nil {
		r.raise(exitFile)
		r.complain("cannot read %s: %v", shownName(name), err)
		return nil
	}
	shown := shownName(name)
	r.texts[shown] = text
	tree, found := syntax.Parse(shown, text)
	r.diagnose(found)
	if found.HasErrors() {
		r.raise(exitUsage)
		return nil
	}
	canonical := syntax.Print(tree)
	differs := !bytes.Equal(text, canonical)
	switch {
	case check && differs:
		r.raise(exitNotMet)
		_, err = fmt.Fprintln(r.out, shown)
	case check:
	case write && differs:
		if err := r.replace(name, canonical, true); err != nil {
			r.raise(exitFile)
			r.complain("cannot write %s: %v", name, err)
		}
	case write:
	default:
		_, err = r.out.Write(canonical)
	}
	if err != nil {
		return &writeError{err}
	}
	return nil
}
