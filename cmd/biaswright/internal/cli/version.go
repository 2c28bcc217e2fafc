package cli

import (
	"fmt"
	"runtime/debug"

	"github.com/urfave/cli/v2"
)

func (r *runner) versionCommand() *cli.Command {
	return &cli.Command{
		Name:  "version",
		Usage: "print the version this program was built from",
		Action: func(c *cli.Context) error {
			if c.NArg() > 0 {
				return usagef("version takes no file")
			}
			if _, err := fmt.Fprintln(r.out, "biaswright "+version()); err != nil {
				return &writeError{err}
			}
			return nil
		},
	}
}

// version is the module's version where the build knows one, else the revision.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "unknown"
	}
	if v := info.Main.Version; v != "" && v != "(devel)" {
		return v
	}
	for _, s := range info.Settings {
		if s.Key == "vcs.revision" {
			return s.Value
		}
	}
	return "unknown"
}
