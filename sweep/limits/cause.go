package limits

import (
	"math"
	"sort"

	"biaswright/netlist"
	"biaswright/solve/mna"
)

// A Cause is why a circuit stops holding, in figures; words are made of it
// elsewhere.
type Cause struct {
	// Left are the parts that have left the region that they work in at the
	// nominal point, the one furthest out first; empty where none has: then the
	// reference itself moved.
	Left []PartState
	// Slope is dQ/d(axis) at the limit, in the held quantity's unit over the
	// axis's; NaN where it does not exist. Relative is Slope over Q.
	Slope, Relative float64
	Carrier
	// Value is the held quantity at the limit.
	Value float64
}

// A PartState is a part that has left its region.
type PartState struct {
	Name string
	// State is "saturated", "off", "reverse", or "starved" for a junction whose
	// current has fallen to less than a quarter.
	State string
	// PNP tells that Volts is V_EC.
	PNP bool
	// Volts is a transistor's V_CE (V_EC) at the limit; Amps a junction's or
	// transistor's current there, and Nominal what it was at the nominal point.
	Volts, Amps, Nominal float64
	out                  float64 // how far out: 1 at the region's edge
}

// starving is the share of its nominal current below which a junction no longer
// sets its voltage: it has lost n V_T ln 4, 36 mV at the least, twice that for the
// usual reference diode.
const starving = 0.25

// explain compares the circuit at the limit with the nominal one.
func (a *Answer) explain(ax *axis, side Side) Cause {
	p := side.Point
	c := Cause{Slope: math.NaN(), Relative: math.NaN(), Carrier: Carrier{Share: math.NaN()}, Value: math.NaN()}
	if v, ok := a.Hold.Q.Eval(p); ok {
		c.Value = v
	}
	for i := range ax.c.Elements {
		e := &ax.c.Elements[i]
		now, was := &p.Elements[i], &ax.start.Elements[i]
		switch e.Kind {
		case netlist.TransistorPart:
			if was.State == "active" && now.State != "active" {
				c.Left = append(c.Left, PartState{
					Name: e.Name, State: now.State, PNP: ax.c.Parts[e.Part].Kind.PNP, Volts: now.Vce, Amps: now.Ic, Nominal: was.Ic,
					out: p.Depth(i),
				})
			}
		case netlist.JunctionPart:
			if i0, i1 := math.Abs(was.I), math.Abs(now.I); i0 > 0 && i1 < starving*i0 && conducts(e, was.I, a, ax) {
				c.Left = append(c.Left, PartState{
					Name: e.Name, State: "starved", Volts: now.V, Amps: now.I, Nominal: was.I, out: starving * i0 / i1,
				})
			}
		}
	}
	sort.SliceStable(c.Left, func(i, j int) bool { return c.Left[i].out > c.Left[j].out })
	if side.Reason == Fold {
		return c // the derivative is infinite there
	}
	if _, d, err := p.Sensitivity(a.Hold.Q); err == nil {
		c.Slope = d[ax.slot]
		c.Relative = c.Slope / c.Value
	}
	if shares, err := p.Contributions(a.Hold.Q, ax.slot); err == nil && c.Slope != 0 {
		c.Carrier = carrier(ax.c, shares, c.Slope)
	}
	return c
}

// A Carrier is the element that passes on most of a slope: Through, with its Share of it.
// Where another takes much of that back, as a reference diode does from the junction that
// it makes up for, that one is Against. Where contributions cancel altogether, or many
// carry a little, there is none, "" and NaN.
type Carrier struct {
	Through, Against string
	Share            float64
}

func carrier(c *netlist.Circuit, shares []mna.Contribution, slope float64) Carrier {
	const (
		least = 0.5 // less is not most of it
		much  = 1.5 // more, and another takes back half of the slope
		most  = 3   // more, and what is left of so much tells nothing of any one part
	)
	out, largest, smallest := Carrier{Share: math.NaN()}, math.Inf(-1), math.Inf(1)
	for _, s := range shares {
		of := s.Amount / slope
		if of > largest {
			out.Through, largest = c.Elements[s.Element].Name, of
		}
		if of < smallest {
			out.Against, smallest = c.Elements[s.Element].Name, of
		}
	}
	if !(largest >= least && largest <= most) {
		return Carrier{Share: math.NaN()}
	}
	if out.Share = largest; largest <= much {
		out.Against = ""
	}
	return out
}

// conducts tells a junction that carried more than leakage at the nominal point.
func conducts(e *netlist.Element, amps float64, a *Answer, ax *axis) bool {
	const leakage = 1e-6 // of the circuit's largest current
	forward := amps
	if e.Reversed {
		forward = -forward
	}
	zener := ax.c.Parts[e.Part].Kind.Name == "zener"
	return (forward > 0 || zener) && math.Abs(amps) > leakage*a.Nominal.LargestCurrent()
}
