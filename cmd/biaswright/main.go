// Command biaswright finds the operating point of a bias network from its text.
//
// Built with the tag urfave_cli_no_docs it leaves out documentation code that it
// does not use, and starts sooner.
package main

import (
	"os"

	"biaswright/cmd/biaswright/internal/cli"
)

func main() { os.Exit(cli.Main(os.Args, os.Stdin, os.Stdout, os.Stderr)) }
