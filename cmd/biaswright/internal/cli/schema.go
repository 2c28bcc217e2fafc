package cli

import (
	"fmt"
	"strings"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist/diag"
)

func (r *runner) schemaCommand() *cli.Command {
	return &cli.Command{
		Name:      "jsonschema",
		Usage:     "print the JSON Schema of what a command prints with --json; without a name, list them",
		UsageText: "biaswright jsonschema [NAME]",
		Action:    r.schema,
	}
}

func (r *runner) schema(c *cli.Context) error {
	var text string
	switch c.NArg() {
	case 0:
		text = strings.Join(render.SchemaNames(), "\n") + "\n"
	case 1:
		name := c.Args().First()
		s, ok := render.Schema(name)
		if !ok {
			e := &usageError{fmt.Sprintf("there is no schema %q", name), diag.DidYouMean(name, render.SchemaNames())}
			if e.hint == "" {
				e.hint = "the schemas are " + strings.Join(render.SchemaNames(), ", ")
			}
			return e
		}
		text = s
	default:
		return usagef("jsonschema takes one name")
	}
	if _, err := fmt.Fprint(r.out, text); err != nil {
		return &writeError{err}
	}
	return nil
}
