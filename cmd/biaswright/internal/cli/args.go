package cli

import (
	"slices"
	"strings"

	"github.com/urfave/cli/v2"
)

// commandIn finds the command among the arguments: the first word that is one's name;
// "" where there is none.
func commandIn(app *cli.App, args []string) string {
	for _, a := range args {
		if a == "--" {
			return ""
		}
		if slices.Contains(commandNames(app), a) {
			return a
		}
	}
	return ""
}

// valued lists the options of a command that take a value, or those of all commands for
// "". One name may be a switch here and take a value there.
func valued(app *cli.App, command string) map[string]bool {
	names := map[string]bool{}
	for _, c := range app.Commands {
		if command != "" && c.Name != command {
			continue
		}
		for _, f := range c.Flags {
			d, ok := f.(cli.DocGenerationFlag)
			if !ok || !d.TakesValue() {
				continue
			}
			for _, n := range f.Names() {
				names[n] = true
			}
		}
	}
	return names
}

// arrange puts the command first, then the options, then the files, so that
// options may stand before or after the files: the option parser stops at the
// first word that is none. What follows "--" is a file whatever it looks like,
// and "-" is standard input. "help NAME" becomes "NAME --help".
func arrange(args []string, valued map[string]bool) ([]string, error) {
	var options, words []string
	rest := args[1:]
	for len(rest) > 0 {
		a := rest[0]
		rest = rest[1:]
		if a == "--" {
			words = append(words, rest...)
			break
		}
		if a == "-" || !strings.HasPrefix(a, "-") {
			words = append(words, a)
			continue
		}
		options = append(options, a)
		name := strings.TrimLeft(a, "-")
		if !valued[name] { // a switch, or --name=value
			continue
		}
		if len(rest) == 0 {
			return args, usagef("option --%s needs a value", name)
		}
		options = append(options, rest[0])
		rest = rest[1:]
	}
	if len(words) > 0 && words[0] == "help" {
		words = words[1:]
		options = []string{"--help"}
	}
	out := []string{args[0]}
	if len(words) > 0 {
		out, words = append(out, words[0]), words[1:]
	}
	out = append(out, options...)
	if len(words) > 0 {
		out = append(append(out, "--"), words...)
	}
	return out, nil
}
