package reftest

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"biaswright/netlist"
	"biaswright/solve"
)

// TestCases solves every network of bias-networks.json from its text and
// compares every figure of the full model, each within its own tolerance, and
// every terminal current that the file lists.
func TestCases(t *testing.T) {
	cases, err := Cases(networksFile)
	if err != nil {
		t.Fatal(err)
	}
	ran, figures, waiting := 0, 0, 0
	for i := range cases {
		c := &cases[i]
		if len(c.Elements) == 0 {
			continue // X56 is a formula; see TestDiodeResistorFigures
		}
		if c.Has("ideal_opamp") {
			waiting++
			continue
		}
		t.Run(c.ID, func(t *testing.T) {
			at := caseAt(t, c)
			n := 0
			for _, f := range append(c.Expected, c.Currents...) {
				if f.Tier != "" && f.Tier != "full_model" {
					continue
				}
				got := at.figure(f)
				if !within(got, f.Value, f.TolRel, f.TolAbs) {
					t.Errorf("%s = %.15g %s, want %.15g within %g relative or %g (%s)",
						f.Name, got, f.Unit, f.Value, f.TolRel, f.TolAbs, c.Source)
				}
				n++
			}
			if n == 0 {
				t.Error("no figure to compare")
			}
			ran++
			figures += n
		})
	}
	t.Logf("%d networks, %d figures; %d with an ideal amplifier wait", ran, figures, waiting)
	// What the file has: 24 operating points, 4 temperature sweeps and 25 book
	// examples with a full model, less two with an ideal amplifier.
	if ran < 51 && !t.Failed() && !filtered() {
		t.Errorf("%d networks ran, expected 51", ran)
	}
}

// A solved is a case solved at the temperatures that its figures ask for.
type solved struct {
	t      *testing.T
	c      *Case
	text   *Text
	plain  *netlist.Circuit
	points map[string]*solve.Point // by setting of ambient
}

func caseAt(t *testing.T, c *Case) *solved {
	t.Helper()
	text, err := c.Text()
	if err != nil {
		t.Fatal(err)
	}
	return &solved{
		t: t, c: c, text: text, points: map[string]*solve.Point{},
		plain: read(t, c.ID+".bias", text.Source),
	}
}

// point solves at the case's own ambient (empty) or at one that is set.
func (s *solved) point(ambient string) *solve.Point {
	s.t.Helper()
	if p := s.points[ambient]; p != nil {
		return p
	}
	circuit := s.plain
	if ambient != "" {
		set, list := circuit.With(netlist.Setting{Name: "ambient", Value: ambient})
		if list.HasErrors() {
			s.t.Fatalf("ambient=%s: %v", ambient, list)
		}
		circuit = set
	}
	p := point(s.t, circuit)
	s.points[ambient] = p
	return p
}

// figure computes what f says in the solved circuit.
func (s *solved) figure(f Figure) float64 {
	s.t.Helper()
	ambient := ""
	if f.At != nil {
		ambient = number(f.At.Celsius) + " degC"
	}
	volts := func(name string) float64 {
		p := s.point(ambient)
		return p.NodeV[node(s.t, p.Circuit, s.text.Node[name])]
	}
	switch {
	case f.Node != "":
		return volts(f.Node)
	case len(f.Nodes) == 2:
		return volts(f.Nodes[0]) - volts(f.Nodes[1])
	case f.Probe != nil:
		return s.current(s.point(ambient), f.Probe)
	case strings.HasPrefix(f.Name, "tempco"):
		// (1/I) dI/dT of the current that the case lists at 25 degC.
		expr, _ := s.terminal(s.c.tempcoProbe())
		p := s.point("25 degC")
		return slope(s.t, p, expr, "ambient") / value(s.t, p, expr)
	case f.Name == "V_LED": // "drop of one LED"; both are alike
		return value(s.t, s.point(ambient), "D1.V")
	}
	s.t.Fatalf("%s: nothing says what it is of", f.Name)
	return 0
}

// tempcoProbe is the one terminal current of a temperature case.
func (c *Case) tempcoProbe() *Probe {
	for _, f := range c.Expected {
		if f.Probe != nil {
			return f.Probe
		}
	}
	return nil
}

// current gives the current into, or out of, a terminal.
func (s *solved) current(p *solve.Point, probe *Probe) float64 {
	s.t.Helper()
	expr, sign := s.terminal(probe)
	if probe.Direction == "out" {
		sign = -sign
	}
	return sign * value(s.t, p, expr)
}

// terminal names a terminal's current in the language, with the sign that makes
// it the current into the terminal: the language counts a transistor's currents
// positive in normal use, an element's along its arrow, and a rail's as what it
// delivers.
func (s *solved) terminal(probe *Probe) (expr string, sign float64) {
	s.t.Helper()
	var e Element
	for _, x := range s.c.Elements {
		if x.Name == probe.Element {
			e = x
		}
	}
	out := map[string]float64{"b": -1, "cathode": -1, "to": -1, "minus": -1}[probe.Terminal]
	if out == 0 {
		out = 1
	}
	switch e.Type {
	case "npn":
		return e.Name + map[string]string{"collector": ".Ic", "base": ".Ib", "emitter": ".Ie"}[probe.Terminal],
			map[string]float64{"collector": 1, "base": 1, "emitter": -1}[probe.Terminal]
	case "pnp":
		return e.Name + map[string]string{"collector": ".Ic", "base": ".Ib", "emitter": ".Ie"}[probe.Terminal],
			map[string]float64{"collector": -1, "base": -1, "emitter": 1}[probe.Terminal]
	case "voltage_source":
		if rail := s.text.Rail[e.Name]; rail != "" {
			return rail + ".I", -out * s.text.Sign[e.Name]
		}
		return e.Name + ".I", -out // a cell's arrow leaves at plus
	case "resistor", "diode", "current_source":
		return e.Name + ".I", out
	}
	s.t.Fatalf("no element %s with a current", probe.Element)
	return "", 0
}

// TestBookFigures shows what the books' idealisations cost: beside each printed
// figure, what the full model gives, and that the deviation is the one that the
// file states.
func TestBookFigures(t *testing.T) {
	cases, err := Cases(networksFile)
	if err != nil {
		t.Fatal(err)
	}
	var table strings.Builder
	fmt.Fprintf(&table, "%-5s %-14s %13s %13s %10s\n", "case", "figure", "book", "full model", "deviation")
	compared := 0
	for i := range cases {
		c := &cases[i]
		if c.Analysis != "textbook" || c.Has("ideal_opamp") || len(c.Elements) == 0 {
			continue
		}
		at := caseAt(t, c)
		full := map[string]Figure{}
		for _, f := range c.Expected {
			if name, ok := strings.CutSuffix(f.Name, " (full model)"); ok {
				full[name] = f
			}
		}
		for _, book := range c.Expected {
			f, ok := full[book.Name]
			if book.Tier != "book" || !ok || book.Deviation == nil {
				continue
			}
			got := at.figure(f)
			deviation := got/book.Value - 1
			fmt.Fprintf(&table, "%-5s %-14s %13.6g %13.6g %9.3f%%\n", c.ID, book.Name, book.Value, got, 100*deviation)
			// The full model's figures hold to 1e-6; so do ratios to a constant.
			if math.Abs(deviation-*book.Deviation) > 2e-6 {
				t.Errorf("%s: %s deviates by %.8g from the book's %g, want %.8g", c.ID, book.Name, deviation, book.Value, *book.Deviation)
			}
			compared++
		}
	}
	t.Logf("%d book figures\n%s", compared, &table)
	if compared < 56 {
		t.Errorf("%d book figures compared, expected at least 56", compared)
	}
}

// TestKnownPoints solves the circuits that have several operating points, or
// whose one is hard to reach: the answer must be one of the listed points that
// are not marked unstable, at every node.
func TestKnownPoints(t *testing.T) {
	circuits, err := Points(pointsFile)
	if err != nil {
		t.Fatal(err)
	}
	if len(circuits) != 16 {
		t.Errorf("%d circuits, expected 16", len(circuits))
	}
	for i := range circuits {
		k := &circuits[i]
		t.Run(k.ID, func(t *testing.T) {
			text, err := k.Text()
			if err != nil {
				t.Fatal(err)
			}
			p := point(t, read(t, k.ID+".bias", text.Source))
			best, nearest := -1, math.Inf(1)
			for j, known := range k.Points {
				if d := distance(t, p, text, known); d < nearest {
					best, nearest = j, d
				}
			}
			if nearest > 1e-6 { // V, the collection's own criterion
				t.Fatalf("no listed point: the nearest, %d, is %g V away", best, nearest)
			}
			if k.Points[best].Sign != 1 {
				t.Errorf("point %d cannot be stable", best)
			}
			if p.Unstable || p.Evidence.Determinant != 1 {
				t.Errorf("determinant sign %d, listed as %d", p.Evidence.Determinant, k.Points[best].Sign)
			}
			t.Logf("point %d of %d, %.1g V off, by %s in %d steps", best+1, len(k.Points), nearest, p.Evidence.Way, p.Evidence.Steps)
		})
	}
}

// distance is the largest difference of a node's voltage, in V.
func distance(t *testing.T, p *solve.Point, text *Text, known KnownPoint) float64 {
	t.Helper()
	far := 0.0
	for name, v := range known.Volts {
		far = max(far, math.Abs(p.NodeV[node(t, p.Circuit, text.Node[name])]-v))
	}
	return far
}
