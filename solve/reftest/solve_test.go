package reftest

import (
	"errors"
	"math"
	"testing"

	"biaswright/devices"
	"biaswright/devices/shelf"

	"biaswright/netlist"
	"biaswright/solve"
)

const (
	networksFile = "../../testdata/reference/bias-networks.json"
	pointsFile   = "../../testdata/reference/operating-points.json"
	circuitsGlob = "../../testdata/circuits/*.bias"
)

// read resolves a text of this package's own making.
func read(t testing.TB, name string, text []byte) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read(name, text, devices.Catalogue(), netlist.Files{Shelves: shelf.All()})
	if c == nil {
		for _, d := range list {
			t.Errorf("%s:%d:%d: %s", name, d.Span.Start.Line, d.Span.Start.Column, d.Message)
		}
		t.Fatalf("%s does not resolve:\n%s", name, text)
	}
	return c
}

// point solves a circuit.
func point(t testing.TB, c *netlist.Circuit) *solve.Point {
	t.Helper()
	r, err := solve.Solve(c, solve.Options{})
	if err != nil {
		var f *solve.Failure
		if errors.As(err, &f) {
			t.Fatalf("%s: %s; tried %v; worst %s by %g A", c.File, f.Says, f.Tried, f.Worst, f.By)
		}
		t.Fatalf("%s: %v", c.File, err)
	}
	return r.Point
}

// value evaluates an expression of quantities at a point.
func value(t *testing.T, p *solve.Point, text string) float64 {
	t.Helper()
	e, list := p.Circuit.ParseExpr(text)
	if list.HasErrors() {
		t.Fatalf("%s: %s: %v", p.Circuit.File, text, list)
	}
	v, ok := e.Eval(p)
	if !ok {
		t.Fatalf("%s: %s has no number", p.Circuit.File, text)
	}
	return v
}

// slope gives d(expression)/d(slot) at a point.
func slope(t *testing.T, p *solve.Point, text, of string) float64 {
	t.Helper()
	e, list := p.Circuit.ParseExpr(text)
	if list.HasErrors() {
		t.Fatalf("%s: %s: %v", p.Circuit.File, text, list)
	}
	id, ok := p.Circuit.Lookup(of)
	if !ok {
		t.Fatalf("%s: no %s", p.Circuit.File, of)
	}
	_, d, err := p.Sensitivity(e)
	if err != nil {
		t.Fatalf("%s: d(%s)/d(%s): %v", p.Circuit.File, text, of, err)
	}
	return d[id]
}

// node finds a node by its name.
func node(t *testing.T, c *netlist.Circuit, name string) netlist.NodeID {
	t.Helper()
	for id, n := range c.Nodes {
		if n.Name == name {
			return netlist.NodeID(id)
		}
	}
	t.Fatalf("%s: no node %s", c.File, name)
	return 0
}

// within tells whether got is want within a relative or an absolute tolerance,
// whichever is wider.
func within(got, want, rel, abs float64) bool {
	return math.Abs(got-want) <= max(rel*math.Abs(want), abs)
}
