package hand

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"

	"biaswright/devices"
	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// An idealisation is a circuit under some of its assumptions: its numbers changed, and
// for each element the drop that is fixed.
type idealisation struct {
	c *netlist.Circuit
	// fixed is where each junction is to stand, from where it stands in the full
	// solution; nil where no drop is assumed.
	fixed []fixing
}

// A fixing is the fixed drops of one element.
type fixing struct {
	drop, breakdown *anchor
}

// An anchor is a fixed drop: from where the junction stands in the full solution, in V,
// to where it is assumed, through amps per unit of size.
type anchor struct{ from, to, amps float64 }

// under gives every row's quantity in the circuit under a combination of players.
func (a *Answer) under(set int) ([]float64, error) {
	var items []int
	for i := range a.Players {
		if set>>i&1 == 1 {
			items = append(items, a.Players[i].Items...)
		}
	}
	if len(items) == 0 {
		return a.read(a.Full), nil
	}
	ideal, err := a.idealise(items)
	if err != nil {
		return nil, err
	}
	return a.settle(ideal)
}

// read evaluates every row's quantity.
func (a *Answer) read(e netlist.Env) []float64 {
	values := make([]float64, len(a.Rows))
	for i := range a.Rows {
		values[i], _ = a.Rows[i].Q.Eval(e) // NaN where there is none
	}
	return values
}

// idealise puts the assumptions in force that change numbers, and collects those that
// fix drops.
func (a *Answer) idealise(items []int) (*idealisation, error) {
	out := &idealisation{c: a.Circuit}
	var set []netlist.Setting
	for _, item := range items {
		set = append(set, out.assume(&a.Circuit.Assumed[item])...)
	}
	var err error
	if out.c, err = with(a.Circuit, set); err != nil {
		return nil, err
	}
	if out.fixed != nil {
		a.anchor(out.fixed)
	}
	return out, nil
}

// assume notes the drops that an assumption fixes, and gives the settings that it comes
// to.
func (o *idealisation) assume(as *netlist.Assumption) (set []netlist.Setting) {
	if as.Key == "ambient" {
		return []netlist.Setting{{Name: as.Key, Value: written(as.Value)}}
	}
	for i := range o.c.Elements {
		if !covers(o.c, as, i) {
			continue
		}
		name := o.c.Elements[i].Name
		switch as.Key {
		case "Vbe":
			o.at(i).drop = &anchor{to: as.Value}
			continue
		case "drop":
			o.at(i).drop = &anchor{to: as.Value}
		case "Vz":
			o.at(i).breakdown = &anchor{to: as.Value}
		case "betaF":
			set = append(set, noRecombination(name)...)
			fallthrough
		default: // betaR, VA
			set = append(set, netlist.Setting{Name: name + "." + as.Key, Value: written(as.Value)})
			continue
		}
		set = append(set, netlist.Setting{Name: name + ".Rbulk", Value: "0"})
	}
	return set
}

// at is an element's place among those whose drops are fixed.
func (o *idealisation) at(element int) *fixing {
	if o.fixed == nil {
		o.fixed = make([]fixing, len(o.c.Elements))
	}
	return &o.fixed[element]
}

// covers tells whether an assumption is of an element. A Vbe of a part's own holds in
// place of that for all transistors, whether it is in force or not.
func covers(c *netlist.Circuit, as *netlist.Assumption, element int) bool {
	e := &c.Elements[element]
	switch {
	case e.Part == netlist.None || as.Part != netlist.None && as.Part != e.Part:
		return false
	case as.Key == "drop" || as.Key == "Vz": // of one part always
		return true
	case e.Kind != netlist.TransistorPart:
		return false
	}
	own := func(other netlist.Assumption) bool { return other.Key == as.Key && other.Part == e.Part }
	return as.Part != netlist.None || !slices.ContainsFunc(c.Assumed, own)
}

// noRecombination are the settings that leave a base current of I_f/betaF alone.
func noRecombination(element string) []netlist.Setting {
	return []netlist.Setting{{Name: element + ".Irec", Value: "0"}, {Name: element + ".betaDrift", Value: "0"}}
}

// with is Circuit.With with its diagnostics as one error.
func with(c *netlist.Circuit, set []netlist.Setting) (*netlist.Circuit, error) {
	if len(set) == 0 {
		return c, nil
	}
	out, diags := c.With(set...)
	if out == nil {
		return nil, errors.New(diags[0].Message)
	}
	return out, nil
}

// written is a number as a setting writes it, in SI base units.
func written(x float64) string {
	if math.IsInf(x, 1) {
		return "infinite"
	}
	return strconv.FormatFloat(x, 'g', -1, 64)
}

// anchor finds the point of the full solution from which each drop is moved: every
// junction of a part at the geometric mean of the currents per unit of size that the
// part's conducting elements carry, and at the mean of their drops.
func (a *Answer) anchor(fixed []fixing) {
	for part := range a.Circuit.Parts {
		drop, breakdown := a.carried(part)
		for i := range fixed {
			if a.Circuit.Elements[i].Part != part {
				continue
			}
			if f := fixed[i].drop; f != nil {
				f.from, f.amps = drop.volts, drop.amps
			}
			if f := fixed[i].breakdown; f != nil {
				f.from, f.amps = breakdown.volts, breakdown.amps
			}
		}
	}
}

// A carrying is a junction's voltage in V and current per unit of size in A.
type carrying struct{ volts, amps float64 }

// carried is what a part's elements carry forward, and in breakdown, in the full
// solution. Where none conducts, it is a small current of the circuit's own at the drop
// where the model stands with it; in the limit no figure depends on it.
func (a *Answer) carried(part int) (forward, breakdown carrying) {
	c, p := a.Circuit, a.Full
	var sumF, sumB struct{ volts, logs, count float64 }
	for i := range c.Elements {
		e := &c.Elements[i]
		if e.Part != part {
			continue
		}
		volts, amps := junctionOf(p, i)
		if math.Abs(amps) <= idle*p.LargestCurrent() {
			continue
		}
		s := &sumF
		if amps < 0 {
			s, volts, amps = &sumB, -volts, -amps
		}
		s.volts += volts
		s.logs += math.Log(amps / c.Value(e.Size))
		s.count++
	}
	mean := func(s struct{ volts, logs, count float64 }) carrying {
		if s.count == 0 {
			return carrying{math.NaN(), math.NaN()}
		}
		return carrying{s.volts / s.count, math.Exp(s.logs / s.count)}
	}
	return mean(sumF), mean(sumB)
}

// idle is the share of the circuit's largest current below which a junction does not
// conduct: the language's bound of a transistor that is off.
const idle = 1e-6

// junctionOf is a junction element's voltage (of one member) and current, anode to
// cathode; a transistor's V_BE and the larger of its collector and emitter current.
func junctionOf(p *solve.Point, element int) (volts, amps float64) {
	e, ep := &p.Circuit.Elements[element], &p.Elements[element]
	if e.Kind == netlist.TransistorPart {
		return ep.Vbe, math.Max(ep.Ic, ep.Ie)
	}
	volts, amps = ep.V/float64(e.Row), ep.I
	if e.Reversed {
		volts, amps = -volts, -amps
	}
	return volts, amps
}

// The way to a fixed drop: the junctions' points are moved to the assumed drops, then
// the junctions made steeper by factors of the square root of two.
const (
	// reads bounds the readings: the last factor is a millionth. So far go only circuits
	// whose current comes to nothing, such as one that lives on a difference of two V_BE.
	reads = 40
	// order is of the extrapolation; a higher one would sum up rounding.
	order = 6
	// enough is the order from which two extrapolations in a row are compared.
	enough = 4
	// settled is how near they must be, relative to the quantity: far below what any
	// screen shows, above what rounding leaves.
	settled = 1e-10
	// worst is how far they may remain apart at the end.
	worst = 1e-5
	// least is the smallest part of the way to the assumed drops taken at a time.
	least = 1.0 / 64
)

// settle solves an idealised circuit, and gives every row's quantity.
func (a *Answer) settle(ideal *idealisation) ([]float64, error) {
	s, err := mna.New(ideal.c)
	if err != nil {
		return nil, err
	}
	if ideal.fixed != nil {
		a.fillIn(ideal.fixed, s.StartCurrent())
		s.Idealise(ideals(ideal.fixed, 0, 1))
	}
	p, err := a.nearest(s)
	if err != nil {
		return nil, err
	}
	if ideal.fixed == nil {
		return a.read(p), nil
	}
	w := &way{s: s, x: append([]float64(nil), p.Unknowns()...), fixed: ideal.fixed}
	if err := w.shift(); err != nil {
		return nil, err
	}
	return a.limit(w)
}

// fillIn gives the anchors of parts that carry nothing a current.
func (a *Answer) fillIn(fixed []fixing, amps float64) {
	for i := range fixed {
		for _, f := range []*anchor{fixed[i].drop, fixed[i].breakdown} {
			if f != nil && math.IsNaN(f.amps) {
				f.from, f.amps = f.to, amps
			}
		}
	}
}

// nearest solves for the point nearest to the full solution, of those that could be
// stable if there are any.
func (a *Answer) nearest(s *mna.System) (*solve.Point, error) {
	res, err := solve.SolveSystem(s, solve.Options{Near: a.Full.Volts()})
	if err != nil {
		return nil, err
	}
	for _, p := range append([]*solve.Point{res.Point}, res.Others...) {
		if p.Unstable == a.Full.Unstable {
			return p, nil
		}
	}
	return res.Point, nil
}

// ideals are the fixed drops at a part of the way from the full solution's to the
// assumed ones, at a factor of the idealities.
func ideals(fixed []fixing, part, factor float64) []devices.Ideal {
	at := func(f *anchor) devices.FixedDrop {
		if f == nil {
			return devices.FixedDrop{}
		}
		return devices.FixedDrop{Volts: math.Max(0, f.from+part*(f.to-f.from)), Amps: f.amps, Factor: factor}
	}
	out := make([]devices.Ideal, len(fixed))
	for i := range fixed {
		out[i] = devices.Ideal{Drop: at(fixed[i].drop), Breakdown: at(fixed[i].breakdown)}
	}
	return out
}

// A way is an idealised circuit on its way to fixed drops.
type way struct {
	s     *mna.System
	x     []float64
	work  newton.Work
	fixed []fixing
}

// step solves with these drops from the last solution; x stays where that fails.
func (w *way) step(part, factor float64) bool {
	w.s.Idealise(ideals(w.fixed, part, factor))
	x := append([]float64(nil), w.x...)
	w.s.From(x)
	if r := newton.Solve(w.s, x, &w.work, newton.Options{}); r.Outcome != newton.Converged {
		return false
	}
	w.x = x
	return true
}

// shift moves the junctions' points to the assumed drops, at their own ideality.
func (w *way) shift() error {
	for at, by := 0.0, 1.0; at < 1; {
		next := math.Min(1, at+by)
		if w.step(next, 1) {
			at = next
			continue
		}
		if by /= 2; by < least {
			return fmt.Errorf("there is no operating point beyond %.0f %% of the way to the drops", 100*at)
		}
	}
	return nil
}

// limit steepens the junctions and extrapolates to infinite steepness, by polynomials in
// the factor (Neville's scheme): a drop is off by the factor times n V_T ln(I/Amps),
// and the quantities are smooth functions of that.
func (a *Answer) limit(w *way) ([]float64, error) {
	var best []float64
	bestBy := math.Inf(1)
	var last [][]float64 // by order, by row
	for read := range reads {
		if !w.step(1, math.Exp2(-float64(read)/2)) {
			break // junctions in reverse, perhaps, that hold a node by less than a double
		}
		now := [][]float64{a.watch(w.s.StateAt(w.x))}
		for j := 1; j <= order && j <= len(last); j++ {
			now = append(now, extrapolate(now[j-1], last[j-1], j))
		}
		if top := len(now) - 1; top >= enough {
			if by := a.apart(now[top], last[len(last)-1]); by < bestBy {
				best, bestBy = now[top], by
			}
		}
		last = now
		if bestBy <= settled {
			break
		}
	}
	if bestBy > worst {
		return nil, errNoLimit
	}
	return best[:len(a.Rows)], nil
}

// watch reads every row's quantity, and behind them every junction's current: where
// those do not settle, two fixed drops stand against each other or straight across a
// supply, whatever the rows' quantities do.
func (a *Answer) watch(e netlist.Env) []float64 {
	values := a.read(e)
	for i := range a.Circuit.Elements {
		for _, symbol := range currents[a.Circuit.Elements[i].Kind] {
			amps, ok := e.Quantity(netlist.Ref{Subject: netlist.OfElement, Index: i, Symbol: symbol})
			if !ok {
				amps = 0
			}
			values = append(values, amps)
		}
	}
	return values
}

// currents are the symbols of the currents that are watched.
var currents = map[netlist.ElementKind][]string{
	netlist.JunctionPart:   {"I"},
	netlist.TransistorPart: {"Ic", "Ib"},
}

// extrapolate takes a power of the factor out of two readings, of which the later's
// factor is smaller by the square root of two for each power up to it.
func extrapolate(later, earlier []float64, power int) []float64 {
	out := make([]float64, len(later))
	for i := range out {
		out[i] = later[i] + (later[i]-earlier[i])/(math.Exp2(float64(power)/2)-1)
	}
	return out
}

// apart is the largest difference of two readings: of a row's quantity relative to the
// larger of it and the full solution's, of a current to the circuit's largest.
func (a *Answer) apart(x, y []float64) float64 {
	most, largest := 0.0, a.Full.LargestCurrent()
	for i := range x {
		d := math.Abs(x[i] - y[i])
		if d == 0 {
			continue
		}
		scale := largest
		if i < len(a.Rows) {
			scale = math.Max(math.Abs(x[i]), math.Abs(a.Rows[i].Full))
		}
		most = math.Max(most, d/scale)
	}
	return most
}
