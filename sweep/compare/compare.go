// Package compare sets topologies for one job side by side: each figure is that of the
// engines that solve one circuit, none is read off a grid.
package compare

import (
	"errors"
	"fmt"
	"math"
	"time"

	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/sweep/limits"
)

// ErrNoTarget says that a file states nothing to be compared by.
var ErrNoTarget = errors.New("the file has no target to be compared by")

// A Topology is one circuit and what it does.
type Topology struct {
	Circuit *netlist.Circuit
	// Failure is why there are no figures; nil where there are.
	Failure error

	Target *netlist.Target
	Limits *limits.Answer
	// Value is the target's quantity at the nominal point, in its unit, and Error
	// its relative deviation from the target.
	Value, Error float64
	// The change of the quantity, the rest at nominal: with the rails between
	// their stated ends, with the ambient temperature, with all stated betaF
	// and with all toleranced resistances at their worst ends.
	Supply, Ambient, Beta, Resistors Span
	// SupplyCurrent is what all rails deliver together, in A (the sum of those
	// that deliver); Efficiency the load's power over the rails'; NaN without a
	// declared load.
	SupplyCurrent, Efficiency float64
	// Hottest is the element with most power, in W.
	Hottest      string
	HottestWatts float64
	// Parts counts what is to be soldered: each member of a row, no links, no
	// ideal elements.
	Parts int
	// Points is how many operating points the circuit is proven to have; 0 where that is
	// not known.
	Points int
}

// A Span is the least and the largest value that the quantity takes, in its unit. NaN
// where nothing is stated to vary.
type Span struct{ Low, High float64 }

// Relative is the span as deviations from a value, as fractions of its size.
func (s Span) Relative(nominal float64) (low, high float64) {
	size := math.Abs(nominal)
	return (s.Low - nominal) / size, (s.High - nominal) / size
}

// Worst is the largest deviation from a value, as a fraction of it.
func (s Span) Worst(nominal float64) float64 {
	low, high := s.Relative(nominal)
	return math.Max(math.Abs(low), math.Abs(high))
}

// Of judges one circuit. What goes wrong stands in the Topology.
func Of(c *netlist.Circuit, workers int) *Topology {
	t := &Topology{Circuit: c}
	t.Failure = t.judge(workers)
	return t
}

func (t *Topology) judge(workers int) error {
	c := t.Circuit
	if len(c.Targets) == 0 {
		return ErrNoTarget
	}
	t.Target = &c.Targets[0]
	var err error
	if t.Limits, err = limits.Find(c, limits.Options{Workers: workers, NoCounts: true}); err != nil {
		return err
	}
	p := t.Limits.Nominal
	value, ok := t.Target.Q.Eval(p)
	if !ok {
		return fmt.Errorf("%s has no number at the nominal point", t.Target.Q.Text)
	}
	t.Value, t.Error = value, (value-t.Target.Value)/math.Abs(t.Target.Value)
	t.power(p)
	for i := range c.Elements {
		t.Parts += parts(&c.Elements[i])
	}
	if all, err := solve.Every(c, solve.EveryOptions{Budget: patience, Workers: workers}); err == nil && all.Search.Proven {
		t.Points = len(all.All())
	}
	return t.spans()
}

// patience bounds the search for all points; ordinary networks take milliseconds.
const patience = 2 * time.Second

func (t *Topology) power(p *solve.Point) {
	watts := 0.0
	for _, r := range p.Rails {
		watts += r.P
		t.SupplyCurrent += r.Delivers()
	}
	t.Efficiency = math.NaN()
	if len(t.Circuit.Load) > 0 {
		t.Efficiency = p.LoadV * p.LoadI / watts
	}
	for i := range p.Elements {
		loaded := false
		for _, l := range t.Circuit.Load {
			loaded = loaded || l == i
		}
		if e := &p.Elements[i]; !loaded && t.Circuit.Elements[i].Kind != netlist.Cell && e.P > t.HottestWatts {
			t.Hottest, t.HottestWatts = t.Circuit.Elements[i].Name, e.P
		}
	}
}

func parts(e *netlist.Element) int {
	switch e.Kind {
	case netlist.Link, netlist.CurrentSource, netlist.Drop, netlist.Cell:
		return 0
	}
	return e.Row
}
