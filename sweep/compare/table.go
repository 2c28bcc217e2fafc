package compare

import (
	"math"

	"biaswright/netlist"
	"biaswright/netlist/quantity"
	"biaswright/sweep/limits"
)

// A Row is one figure of every topology.
type Row struct {
	// Key names it: "value", "error", "supply", "ambient", "beta", "resistors",
	// "load", "dropout", "line", "output", "tempco", "current", "efficiency",
	// "hottest", "points", "parts".
	Key string
	// Axis is the axis that dropout, line, output and load are about.
	Axis string
	Unit quantity.Unit // One for a fraction; a line is a fraction per volt, a tempco per kelvin
	// Low and High are the ends of a span, or both the number; NaN where a
	// topology has none.
	Low, High []float64
	// Best marks the topologies that none does better than; none is marked where
	// all are alike, or where more is neither better nor worse.
	Best []bool
}

// Number is topology i's figure where the row is no span.
func (r *Row) Number(i int) float64 { return r.Low[i] }

// Table makes the rows of topologies, which have their figures or a Failure.
func Table(ts []*Topology) []Row {
	var rows []Row
	span := func(key, axis string, unit quantity.Unit, of func(*Topology) (low, high float64), score func(low, high float64) float64) {
		r := Row{Key: key, Axis: axis, Unit: unit}
		scores := make([]float64, len(ts))
		for i, t := range ts {
			low, high := math.NaN(), math.NaN()
			if t.Failure == nil {
				low, high = of(t)
			}
			r.Low, r.High = append(r.Low, low), append(r.High, high)
			scores[i] = score(low, high)
		}
		r.Best = best(scores)
		rows = append(rows, r)
	}
	number := func(key, axis string, unit quantity.Unit, of func(*Topology) float64, score func(float64) float64) {
		span(key, axis, unit, func(t *Topology) (float64, float64) { v := of(t); return v, v }, func(v, _ float64) float64 { return score(v) })
	}
	worst := func(low, high float64) float64 { return math.Max(math.Abs(low), math.Abs(high)) }
	change := func(key string, of func(*Topology) Span) {
		span(key, "", quantity.One, func(t *Topology) (float64, float64) { return of(t).Relative(t.Value) }, worst)
	}
	number("value", "", unitOf(ts), func(t *Topology) float64 { return t.Value }, indifferent)
	number("error", "", quantity.One, func(t *Topology) float64 { return t.Error }, math.Abs)
	change("supply", func(t *Topology) Span { return t.Supply })
	change("ambient", func(t *Topology) Span { return t.Ambient })
	change("beta", func(t *Topology) Span { return t.Beta })
	change("resistors", func(t *Topology) Span { return t.Resistors })
	axes := axesOf(ts)
	for _, axis := range axes {
		switch axis {
		case "ambient":
		case netlist.LoadName:
			span("load", axis, quantity.Volt, func(t *Topology) (float64, float64) { return t.window(axis) }, func(low, high float64) float64 { return low - high })
		default:
			number("dropout", axis, quantity.Volt, func(t *Topology) float64 { return t.dropout(axis) }, math.Abs)
		}
	}
	for _, axis := range axes {
		switch axis {
		case "ambient":
			number("tempco", axis, quantity.PerKelvin, func(t *Topology) float64 { return t.regulation(axis).Relative }, math.Abs)
		case netlist.LoadName:
			number("output", axis, quantity.Ohm, func(t *Topology) float64 { return t.regulation(axis).Resistance }, func(ohms float64) float64 { return -ohms })
		default:
			number("line", axis, quantity.One, func(t *Topology) float64 { return t.regulation(axis).Relative }, math.Abs)
		}
	}
	less := func(v float64) float64 { return v }
	number("current", "", quantity.Ampere, func(t *Topology) float64 { return t.SupplyCurrent }, less)
	number("efficiency", "", quantity.One, func(t *Topology) float64 { return t.Efficiency }, func(v float64) float64 { return -v })
	number("hottest", "", quantity.Watt, func(t *Topology) float64 { return t.HottestWatts }, less)
	number("points", "", quantity.One, func(t *Topology) float64 {
		if t.Points == 0 {
			return math.NaN()
		}
		return float64(t.Points)
	}, less)
	number("parts", "", quantity.One, func(t *Topology) float64 { return float64(t.Parts) }, less)
	return rows
}

func indifferent(float64) float64 { return math.NaN() }

func unitOf(ts []*Topology) quantity.Unit {
	for _, t := range ts {
		if t.Target != nil {
			return t.Target.Q.Unit
		}
	}
	return quantity.One
}

// best marks the least of the scores, all that share it; none where all are the same,
// or alone.
func best(scores []float64) []bool {
	low, high := math.Inf(1), math.Inf(-1)
	for _, s := range scores {
		if !math.IsNaN(s) {
			low, high = math.Min(low, s), math.Max(high, s)
		}
	}
	out := make([]bool, len(scores))
	const alike = 1e-9 // of the largest: what rounding parts
	slack := alike * math.Max(math.Abs(low), math.Abs(high))
	if !(high-low > slack) {
		return out
	}
	for i, s := range scores {
		out[i] = s <= low+slack
	}
	return out
}

// axesOf are the axes of all topologies, in the order in which they come.
func axesOf(ts []*Topology) []string {
	var out []string
	seen := map[string]bool{}
	for _, t := range ts {
		if t.Failure != nil {
			continue
		}
		for i := range t.Limits.Limits {
			if name := t.Limits.Limits[i].Axis; !seen[name] {
				seen[name] = true
				out = append(out, name)
			}
		}
	}
	return out
}

// Limit is the topology's limit along an axis, nil without one.
func (t *Topology) Limit(axis string) *limits.Limit {
	for i := range t.Limits.Limits {
		if l := &t.Limits.Limits[i]; l.Axis == axis {
			return l
		}
	}
	return nil
}

// window is what the load's voltage may be, as far as it was searched.
func (t *Topology) window(axis string) (low, high float64) {
	l := t.Limit(axis)
	if l == nil {
		return math.NaN(), math.NaN()
	}
	return l.Low.HoldsTo(), l.High.HoldsTo()
}

// dropout is the supply nearest 0 that still holds, NaN where it holds all the way.
func (t *Topology) dropout(axis string) float64 {
	l := t.Limit(axis)
	switch {
	case l == nil:
		return math.NaN()
	case l.Nominal < 0:
		return l.High.At
	}
	return l.Low.At
}

func (t *Topology) regulation(axis string) limits.Regulation {
	for _, r := range t.Limits.Regulation {
		if r.Axis == axis {
			return r
		}
	}
	return limits.Regulation{Relative: math.NaN(), Resistance: math.NaN()}
}

// BreaksFirst is the limit that is nearest, measured by the way from nominal to the end of
// the axis's stated range. Where no such axis has a limit, it is the one that takes the
// smallest share of its search; nil where there is none at all.
func (t *Topology) BreaksFirst() (l *limits.Limit, high bool) {
	least, ranged := math.Inf(1), false
	for i := range t.Limits.Limits {
		lim := &t.Limits.Limits[i]
		for _, up := range []bool{false, true} {
			side, end := lim.Low, lim.From
			if up {
				side, end = lim.High, lim.To
			}
			id, ok := t.Circuit.Lookup(lim.Axis)
			if ok = ok && t.Circuit.Slots[id].Bounds.Stated; ok {
				end = t.Circuit.Slots[id].Bounds.Low
				if up {
					end = t.Circuit.Slots[id].Bounds.High
				}
			}
			if !side.Limited() || end == lim.Nominal || ranged && !ok {
				continue
			}
			room := math.Abs(side.At-lim.Nominal) / math.Abs(end-lim.Nominal)
			if room < least || ok && !ranged {
				least, l, high, ranged = room, lim, up, ok
			}
		}
	}
	return l, high
}
