package cli

import (
	"fmt"
	"strings"

	"github.com/urfave/cli/v2"

	"biaswright/netlist"
)

// Options that most commands have.

func setFlag() cli.Flag {
	return &cli.StringSliceFlag{Name: "set", Usage: "`NAME=VALUE`: change a rail, a value, ambient or a part's parameter; may be repeated"}
}

func jsonFlag() cli.Flag {
	return &cli.BoolFlag{Name: "json", Usage: "print the answer as JSON", DisableDefaultText: true}
}

func plainFlag() cli.Flag {
	return &cli.BoolFlag{Name: "plain", Usage: "print ASCII only", DisableDefaultText: true}
}

// A request is what the options ask for that commands share.
type request struct {
	set, at []netlist.Setting
	near    []netlist.Setting
	trace   func(string)
	chart   chartFile
	sketch  bool
	search  searchRequest
}

// request reads the options that are the same for every file and command; where a command
// has no such option it reads nothing.
func (r *runner) request(c *cli.Context) (*request, error) {
	q := &request{}
	for _, text := range c.StringSlice("set") {
		s, err := setting("set", text, "NAME=VALUE")
		if err != nil {
			return nil, err
		}
		q.set = append(q.set, s)
	}
	for _, list := range c.StringSlice("at") {
		for _, text := range strings.Split(list, ",") {
			s, err := setting("at", text, "NAME=low, NAME=high or NAME=nominal")
			if err != nil {
				return nil, err
			}
			q.at = append(q.at, s)
		}
	}
	for _, text := range c.StringSlice("near") {
		s, err := setting("near", text, "NODE=VOLTS")
		if err != nil {
			return nil, err
		}
		q.near = append(q.near, s)
	}
	q.sketch = c.Bool("sketch")
	var err error
	if q.chart, err = chartOption(c); err != nil {
		return nil, err
	}
	if c.Bool("trace") {
		q.trace = func(line string) { fmt.Fprintln(r.err, line) }
	}
	return q, nil
}

func setting(option, text, form string) (netlist.Setting, error) {
	name, value, ok := strings.Cut(text, "=")
	name, value = strings.TrimSpace(name), strings.TrimSpace(value)
	if !ok || name == "" || value == "" {
		return netlist.Setting{}, &usageError{fmt.Sprintf("--%s %q says nothing", option, text), "write --" + option + " " + form}
	}
	return netlist.Setting{Name: name, Value: value}, nil
}
