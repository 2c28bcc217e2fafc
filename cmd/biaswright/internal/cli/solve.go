package cli

import (
	"errors"
	"fmt"
	"runtime"
	"strings"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
)

func (r *runner) solveCommand() *cli.Command {
	return &cli.Command{
		Name:      "solve",
		Usage:     "find the operating point of each file",
		UsageText: "biaswright solve [options] FILE...",
		Flags: []cli.Flag{
			&cli.StringSliceFlag{Name: "set", Usage: "`NAME=VALUE`: change a rail, a value, ambient or a part's parameter; may be repeated"},
			&cli.StringSliceFlag{Name: "at", Usage: "`NAME=low|high,...`: take the stated ends of rails and of ambient, and judge hold against nominal"},
			&cli.StringSliceFlag{Name: "near", Usage: "`NODE=VOLTS`: start there, and take the nearest of several operating points; may be repeated"},
			chartFlag("where the volts go, path by path,"),
			&cli.BoolFlag{Name: "every", Usage: "find every operating point, and prove that there are no others", DisableDefaultText: true},
			&cli.DurationFlag{Name: "budget", Usage: "`TIME` after which the search for every point ends, such as 30s", Value: searchBudget},
			&cli.BoolFlag{Name: "quick", Usage: "with --every: follow branches instead of searching everywhere; proves nothing", DisableDefaultText: true},
			&cli.BoolFlag{Name: "enclose", Usage: "print intervals that surely contain the exact solution", DisableDefaultText: true},
			&cli.IntFlag{Name: "workers", Usage: "with --every: `N` boxes at a time; the answer is the same", Value: runtime.NumCPU()},
			sketchFlag(),
			&cli.BoolFlag{Name: "trace", Usage: "tell the solver's steps on standard error", DisableDefaultText: true},
			&cli.BoolFlag{Name: "json", Usage: "print the answer as JSON", DisableDefaultText: true},
			&cli.BoolFlag{Name: "plain", Usage: "print ASCII only", DisableDefaultText: true},
		},
		Action: r.solve,
	}
}

// A request is what the options of solve ask for.
type request struct {
	set, at []netlist.Setting
	near    []netlist.Setting
	trace   func(string)
	chart   chartFile
	sketch  bool
	search  searchRequest
}

func (r *runner) solve(c *cli.Context) error {
	if c.NArg() == 0 {
		return &usageError{"solve needs a file", `"-" is standard input`}
	}
	r.plain = c.Bool("plain")
	q, err := r.request(c)
	if err != nil {
		return err
	}
	q.sketch = c.Bool("sketch")
	if q.search, err = searchOptions(c); err != nil {
		return err
	}
	if q.chart, err = chartOption(c); err != nil {
		return err
	}
	if err := q.chart.oneFile(c); err != nil {
		return err
	}
	files := c.Args().Slice()
	if c.Bool("json") {
		return r.solveJSON(files, q)
	}
	look := r.look()
	for i, name := range files {
		a, trouble := r.answer(name, q)
		if trouble != nil {
			r.tell(trouble)
			continue
		}
		r.diagnose(a.Warnings)
		if i > 0 {
			fmt.Fprintln(r.out)
		}
		if err := render.Screen(r.out, a, look); err != nil {
			return &writeError{err}
		}
	}
	return nil
}

// solveJSON prints one object, or for several files an array of them.
func (r *runner) solveJSON(files []string, q *request) error {
	var all []any
	for _, name := range files {
		a, trouble := r.answer(name, q)
		if trouble != nil {
			all = append(all, trouble.json())
			continue
		}
		all = append(all, render.JSON(a))
	}
	var v any = all
	if len(all) == 1 {
		v = all[0]
	}
	if err := render.WriteJSON(r.out, v); err != nil {
		return &writeError{err}
	}
	return nil
}

// request reads the options that are the same for every file.
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

// Trouble is why a file has no answer.
type trouble struct {
	file  string
	found diag.List // what is wrong with its text or the settings
	err   error     // why it could not be read
}

func (t *trouble) json() any {
	if t.err != nil {
		return render.Problem(t.file, "unreadable", "cannot read the file: "+t.err.Error(), "")
	}
	return render.Errors(t.file, t.found)
}

func (r *runner) tell(t *trouble) {
	if t.err != nil {
		r.complain("cannot read %s: %v", t.file, t.err)
		return
	}
	r.diagnose(t.found)
}

// answer solves one file and notes the exit code it earns.
func (r *runner) answer(name string, q *request) (*render.Answer, *trouble) {
	in, trouble := r.open(name, q, closed)
	if trouble != nil {
		return nil, trouble
	}
	a := &render.Answer{File: in.name, Circuit: in.actual, Set: q.set, At: q.at, Inner: q.trace != nil, Warnings: in.warnings}
	r.fill(a, in.nominal, solve.Options{Near: in.near, Trace: q.trace}, q.search)
	if a.Failure != nil {
		return a, nil
	}
	r.illustrate(q, a)
	return a, nil
}

// An input is a file as circuits: at its nominal point, and at the ends asked for, which is
// the same without any.
type input struct {
	name            string // as answers and messages have it
	nominal, actual *netlist.Circuit
	near            map[netlist.NodeID]float64
	warnings        diag.List
}

// Whether resistances may be open in what is read.
type openness bool

const (
	closed openness = false
	open   openness = true
)

// open reads a file, applies the settings and binds --near. It notes the exit code of what
// is wrong.
func (r *runner) open(name string, q *request, values openness) (*input, *trouble) {
	in := &input{name: shownName(name)}
	text, err := r.read(name)
	if err != nil {
		r.raise(exitFile)
		return nil, &trouble{file: in.name, err: err}
	}
	r.texts[in.name] = text
	var wrong diag.List
	if values == open {
		in.nominal, in.warnings, wrong = r.circuit(in.name, text, q)
		in.actual = in.nominal
	} else {
		in.nominal, in.actual, in.warnings, wrong = r.circuits(in.name, text, q)
	}
	if wrong.HasErrors() {
		return nil, r.refuse(in.name, wrong)
	}
	if in.near, wrong = nearPoint(in.actual, q.near); wrong.HasErrors() {
		return nil, r.refuse(in.name, wrong)
	}
	return in, nil
}

// refuse is what is wrong with a file's text, its settings, or what is asked of it.
func (r *runner) refuse(file string, found diag.List) *trouble {
	r.raise(exitUsage)
	return &trouble{file: file, found: found}
}

// circuits reads a text and applies the settings. The first circuit is at its
// nominal point; the second at the ends asked for, and the same without any.
func (r *runner) circuits(name string, text []byte, q *request) (nominal, actual *netlist.Circuit, warnings, wrong diag.List) {
	c, warnings, wrong := r.circuit(name, text, q)
	if wrong.HasErrors() {
		return nil, nil, nil, wrong
	}
	if wrong := stillOpen(c); len(wrong) > 0 {
		return nil, nil, nil, wrong
	}
	if len(q.at) == 0 {
		return c, c, warnings, nil
	}
	at, found := c.At(q.at...)
	if found.HasErrors() {
		return nil, nil, nil, found
	}
	return c, at, append(warnings, found...), nil
}

// circuit reads a text and applies the settings; resistances may be open.
func (r *runner) circuit(name string, text []byte, q *request) (c *netlist.Circuit, warnings, wrong diag.List) {
	c, found := netlist.Read(name, text, devices.Catalogue(), r.library())
	if found.HasErrors() {
		return nil, nil, found
	}
	warnings = found
	if len(q.set) > 0 {
		if c, found = c.With(q.set...); found.HasErrors() {
			return nil, nil, found
		}
		warnings = append(warnings, found...)
	}
	return c, warnings, nil
}

// stillOpen finds resistances without a value: nothing can be solved with them.
func stillOpen(c *netlist.Circuit) diag.List {
	var wrong diag.List
	for i := range c.Elements {
		if e := &c.Elements[i]; e.Kind == netlist.Open {
			wrong = append(wrong, diag.Diagnostic{
				Code: "open-value", Span: e.Span,
				Message: fmt.Sprintf("%s has no value yet (? %s)", e.Name, e.Series),
				Hint:    fmt.Sprintf("biaswright choose finds one; --set %s=VALUE gives it one", e.Name),
			})
		}
	}
	return wrong
}

// fill solves and judges.
func (r *runner) fill(a *render.Answer, nominal *netlist.Circuit, o solve.Options, search searchRequest) {
	if f := points(a, nominal, o, search); f != nil {
		r.raise(exitNoPoint)
		a.Result, a.Failure = nil, f
		return
	}
	p := a.Result.Point
	a.Verdicts = solve.Judge(p, a.Nominal)
	a.Cautions = solve.Cautions(p)
	for _, v := range a.Verdicts {
		if !v.Met {
			r.raise(exitNotMet)
		}
	}
	for _, c := range a.Cautions {
		if c.Kind == "rating" {
			r.raise(exitNotMet)
		}
	}
}

// points finds the point asked for and, where ends are taken, the nominal one
// that a hold is judged against.
func points(a *render.Answer, nominal *netlist.Circuit, o solve.Options, search searchRequest) *solve.Failure {
	if err := search.solve(a, o); err != nil {
		return failure(err)
	}
	traceInner(a.Result.Point, o.Trace)
	if len(a.At) == 0 {
		return nil
	}
	if o.Trace != nil {
		o.Trace("at the nominal point:")
	}
	res, err := solve.Solve(nominal, o)
	if err != nil {
		f := *failure(err)
		f.Says = "at the nominal point: " + f.Says
		return &f
	}
	traceInner(res.Point, o.Trace)
	a.Nominal = res.Point
	return nil
}

func failure(err error) *solve.Failure {
	var f *solve.Failure
	if errors.As(err, &f) {
		return f
	}
	return &solve.Failure{Says: err.Error()}
}

// traceInner tells the voltages of nodes that the screen leaves out.
func traceInner(p *solve.Point, trace func(string)) {
	if trace == nil {
		return
	}
	for _, n := range p.Inner {
		trace(fmt.Sprintf("%s at %.6g V", n.Name, n.V))
	}
}
