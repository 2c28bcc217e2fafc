package cli

import (
	"bytes"
	"fmt"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/devices"
	"biaswright/devices/shelf"
	"biaswright/netlist"
)

func (r *runner) partsCommand() *cli.Command {
	return &cli.Command{
		Name:      "parts",
		Usage:     "list the parts that ship (use generic)",
		UsageText: "biaswright parts [--json | --source | --plain]",
		Flags: []cli.Flag{
			&cli.BoolFlag{Name: "json", Usage: "print the list as JSON", DisableDefaultText: true},
			&cli.BoolFlag{Name: "source", Usage: "print the parts as the text that they are, with the source of each value", DisableDefaultText: true},
			plainFlag(),
		},
		Action: r.parts,
	}
}

func (r *runner) parts(c *cli.Context) error {
	if c.NArg() > 0 {
		return usagef("parts takes no file")
	}
	r.plain = c.Bool("plain")
	var shelves []*netlist.Circuit
	var texts [][]byte
	for _, name := range shelf.Names() {
		text, _ := shelf.Text(name)
		parts, found := netlist.ReadParts("shelf "+name, text, devices.Catalogue(), r.library())
		if found.HasErrors() {
			panic(fmt.Sprintf("the shelf that ships has errors: %v", found)) // a test reads it
		}
		shelves, texts = append(shelves, parts), append(texts, text)
	}
	var err error
	switch {
	case c.Bool("json") && c.Bool("source"):
		return usagef("--json and --source exclude each other")
	case c.Bool("json"):
		err = render.WriteJSON(r.out, render.PartsJSON(shelves))
	case c.Bool("source"):
		_, err = r.out.Write(bytes.Join(texts, []byte("\n")))
	default:
		err = render.Parts(r.out, shelves, r.look())
	}
	if err != nil {
		return &writeError{err}
	}
	return nil
}
