package cli

import (
	"fmt"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/netlist/diag"
)

// A trouble is why a file has no answer.
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
