package hand

import (
	"math"

	"biaswright/netlist"
	"biaswright/solve"
)

// A Finding is what the full solution shows of one thing that is assumed: the figure
// behind a share.
type Finding struct {
	Item int // index into Circuit.Assumed
	// Element is the junction or transistor, netlist.None for the ambient temperature.
	Element int
	// Real is the figure of the full solution, in the unit of what is assumed: for Vbe,
	// drop and Vz the voltage in V (of one member of a row, bulk resistance included),
	// for betaF the base current in A where it is assumed infinite and I_C/I_B where
	// not, for VA the Early effect's share of the transport current as a fraction, for
	// betaR the collector junction's share of the base current as a fraction, for
	// ambient degC.
	Real float64
}

// findings are the figures behind an assumption, in the order of the elements; those
// that do not conduct show none.
func findings(p *solve.Point, item int) []Finding {
	c := p.Circuit
	as := &c.Assumed[item]
	if as.Key == "ambient" {
		return []Finding{{item, netlist.None, c.Value(c.Ambient)}}
	}
	var out []Finding
	for i := range c.Elements {
		if !covers(c, as, i) {
			continue
		}
		volts, amps := junctionOf(p, i)
		if math.Abs(amps) <= idle*p.LargestCurrent() {
			continue
		}
		if real, ok := figure(p, as, i, volts, amps); ok {
			out = append(out, Finding{item, i, real})
		}
	}
	return out
}

// figure is one element's figure for an assumption that is of it; false where it
// conducts the other way than the assumption means.
func figure(p *solve.Point, as *netlist.Assumption, element int, volts, amps float64) (float64, bool) {
	e, ep := &p.Circuit.Elements[element], &p.Elements[element]
	switch as.Key {
	case "Vbe":
		return volts, true
	case "drop":
		return volts, amps > 0
	case "Vz":
		return -volts, amps < 0
	case "betaF":
		if math.IsInf(as.Value, 1) {
			return ep.Ib, true
		}
		return ep.Ic / ep.Ib, true
	case "betaR":
		return p.CollectorShare(element), true
	default: // VA
		return (ep.Vce - ep.Vbe) / p.Slot(e.Params[p.Circuit.Parts[e.Part].Kind.Index("VA")]), true
	}
}
