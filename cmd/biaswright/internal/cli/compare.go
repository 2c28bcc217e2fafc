package cli

import (
	"fmt"
	"runtime"
	"sync"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/sweep/compare"
)

func (r *runner) compareCommand() *cli.Command {
	return &cli.Command{
		Name:      "compare",
		Usage:     "set topologies for one job side by side",
		UsageText: "biaswright compare [options] FILE FILE...",
		Flags: []cli.Flag{
			&cli.StringSliceFlag{Name: "set", Usage: "`NAME=VALUE`: change a rail, a value, ambient or a part's parameter in every file; may be repeated"},
			&cli.BoolFlag{Name: "anyway", Usage: "compare files whose targets, rails, ambient or loads differ", DisableDefaultText: true},
			chartFlag("all topologies over supply, load voltage and ambient"),
			&cli.IntFlag{Name: "workers", Usage: "`N` files at a time; the answer is the same", Value: runtime.NumCPU()},
			&cli.BoolFlag{Name: "csv", Usage: "print comma-separated values, a row a file", DisableDefaultText: true},
			jsonFlag(),
			plainFlag(),
		},
		Action: r.compare,
	}
}

func (r *runner) compare(c *cli.Context) error {
	r.plain = c.Bool("plain")
	q, err := r.request(c)
	if err != nil {
		return err
	}
	files, workers := c.Args().Slice(), c.Int("workers")
	switch {
	case len(files) < 2:
		return &usageError{"compare needs two files or more", "biaswright limits FILE tells of one"}
	case c.Bool("csv") && c.Bool("json"):
		return usagef("--csv and --json are two answers; choose one")
	case workers < 1:
		return usagef("--workers %d: at least one must work", workers)
	}
	a, troubles := r.compareFiles(files, q, c.Bool("anyway"))
	if len(troubles) > 0 {
		return r.tellAll(troubles, c.Bool("json"))
	}
	r.judgeAll(a, workers)
	if q.chart.wanted() {
		r.illustrateComparison(q.chart, a)
	}
	switch {
	case c.Bool("json"):
		return r.writeAll([]any{render.CompareJSON(a)})
	case c.Bool("csv"):
		r.diagnose(a.Warnings)
		err = render.CompareCSV(r.out, a)
	default:
		r.diagnose(a.Warnings)
		err = render.CompareScreen(r.out, a, r.look())
	}
	if err != nil {
		return &writeError{err}
	}
	return nil
}

// tellAll reports what is wrong with files.
func (r *runner) tellAll(troubles []*trouble, asJSON bool) error {
	var all []any
	for _, t := range troubles {
		if asJSON {
			all = append(all, t.json())
		} else {
			r.tell(t)
		}
	}
	return r.writeAll(all)
}

// compareFiles reads the files, and refuses those that are not for one job.
func (r *runner) compareFiles(files []string, q *request, anyway bool) (*render.CompareAnswer, []*trouble) {
	a := &render.CompareAnswer{Set: q.set}
	var troubles []*trouble
	for _, name := range files {
		in, trouble := r.open(name, q, closed)
		if trouble != nil {
			troubles = append(troubles, trouble)
			continue
		}
		shown, c := in.name, in.actual
		var wrong diag.List
		if len(c.Targets) == 0 {
			wrong = diag.List{{Code: "no-target", Span: diag.Span{File: shown}, Message: compare.ErrNoTarget.Error(), Hint: "add: target LAMP.I = 15 mA within 10%"}}
		}
		if !wrong.HasErrors() && len(a.Topologies) > 0 && !anyway {
			wrong = differing(a.Files[0], a.Topologies[0].Circuit, shown, c)
		}
		if wrong.HasErrors() {
			troubles = append(troubles, r.refuse(shown, wrong))
			continue
		}
		a.Files = append(a.Files, shown)
		a.Topologies = append(a.Topologies, &compare.Topology{Circuit: c})
		a.Warnings = append(a.Warnings, in.warnings...)
	}
	return a, troubles
}

// differing says what keeps a file from being for the first one's job.
func differing(first string, a *netlist.Circuit, file string, b *netlist.Circuit) diag.List {
	var wrong diag.List
	for _, d := range compare.Differences(a, b) {
		wrong = append(wrong, diag.Diagnostic{
			Code: "differs", Span: diag.Span{File: file},
			Message: fmt.Sprintf("%s differs from %s: %s there, %s here", d.What, first, orNothing(d.First), orNothing(d.Other)),
			Hint:    "--anyway compares all the same",
		})
	}
	return wrong
}

func orNothing(s string) string {
	if s == "" {
		return "nothing"
	}
	return s
}

// judgeAll works out every topology, so many at a time.
func (r *runner) judgeAll(a *render.CompareAnswer, workers int) {
	slots := make(chan struct{}, workers)
	var wait sync.WaitGroup
	for i, t := range a.Topologies {
		slots <- struct{}{}
		wait.Add(1)
		go func() {
			defer wait.Done()
			a.Topologies[i] = compare.Of(t.Circuit, 1)
			<-slots
		}()
	}
	wait.Wait()
	for _, t := range a.Topologies {
		if t.Failure != nil {
			r.raise(exitNoPoint)
		}
	}
}
