package mna

import (
	"errors"
	"fmt"
	"math"

	"biaswright/solve/every"
	"biaswright/solve/interval"
)

// MostCurrent bounds each junction's current in A in the search for all points: what no
// part of a bias network carries.
const MostCurrent = 10

// ErrNoNeutral is wrapped by what keeps a circuit from being searched.
var ErrNoNeutral = errors.New("cannot be searched for all operating points")

// A Scope is what a neutral system's start box leaves out.
type Scope struct {
	// Amps bounds each junction's current. Low and High bound node voltages in V;
	// Proved tells that no operating point lies outside them, since without current
	// sources no node can rise above the supplies.
	Amps, Low, High float64
	Proved          bool
}

// Neutral is the system as balances that name no circuit, with all numbers in force and
// no ramp, for the search for all points.
func (s *System) Neutral() (*every.System, Scope, error) {
	n := &neutral{s: s, out: &every.System{N: s.n, Rows: make([]every.Row, s.n), Monotone: len(s.bipolars) == 0}, lin: make([]map[int]float64, s.n)}
	for i := range n.lin {
		n.lin[i] = map[int]float64{}
	}
	for i := range s.resistors {
		r := &s.resistors[i]
		n.conductance(r.a, r.b, r.g)
	}
	for i := range s.sources {
		c := &s.sources[i]
		n.constant(c.ra, c.amps)
		n.constant(c.rb, -c.amps)
	}
	for i := range s.junctions {
		if err := n.junction(&s.junctions[i]); err != nil {
			return nil, Scope{}, err
		}
	}
	for i := range s.bipolars {
		if err := n.bipolar(&s.bipolars[i]); err != nil {
			return nil, Scope{}, err
		}
	}
	for i := range n.lin {
		for j := range s.n {
			if g := n.lin[i][j]; g != 0 {
				n.out.Rows[i].Lin = append(n.out.Rows[i].Lin, every.Term{At: j, Coef: g})
			}
		}
	}
	scope := n.scope()
	for node, row := range s.row {
		if int(row) < s.n && n.out.Start == nil {
			n.out.Start = make([]interval.I, s.n)
			for i := range n.out.Start {
				n.out.Start[i] = interval.Whole
			}
		}
		if int(row) < s.n {
			at := interval.I{Lo: interval.Down(scope.Low - s.full[node]), Hi: interval.Up(scope.High - s.full[node])}
			n.out.Start[row] = n.out.Start[row].Meet(at)
		}
	}
	return n.out, scope, nil
}

type neutral struct {
	s   *System
	out *every.System
	lin []map[int]float64
	at  map[pairOf]int // exponentials that are there
}

// A pairOf tells exponentials apart.
type pairOf struct {
	a, b                 int
	offset, offset0, phi float64
}

func (n *neutral) free(row int32) int {
	if int(row) == n.s.n {
		return -1
	}
	return int(row)
}

func (n *neutral) constant(row int32, amps float64) {
	if int(row) < n.s.n {
		n.out.Rows[row].Const += amps
	}
}

func (n *neutral) conductance(a, b int32, g float64) {
	ra, rb := n.s.row[a], n.s.row[b]
	if ra == rb && int(ra) < n.s.n { // between nodes of one group: a constant
		return
	}
	amps := g * (n.s.full[a] - n.s.full[b])
	n.constant(ra, amps)
	n.constant(rb, -amps)
	add := func(i, j int32, v float64) {
		if int(i) < n.s.n && int(j) < n.s.n {
			n.lin[i][int(j)] += v
		}
	}
	add(ra, ra, g)
	add(ra, rb, -g)
	add(rb, ra, -g)
	add(rb, rb, g)
}

// exponential gives the index of exp((v_a - v_b - offset0)/phi), by nodes, with most as an
// upper bound of it.
func (n *neutral) exponential(a, b int32, offset0, phi, most float64) int {
	key := pairOf{n.free(n.s.row[a]), n.free(n.s.row[b]), n.s.full[a] - n.s.full[b], offset0, phi}
	if key.a == key.b { // one group, or both known: a constant difference
		key.a, key.b = -1, -1
	}
	if n.at == nil {
		n.at = map[pairOf]int{}
	}
	k, ok := n.at[key]
	if !ok {
		k = len(n.out.Exps)
		n.at[key] = k
		n.out.Exps = append(n.out.Exps, every.Exponential{A: key.a, B: key.b, Offset: key.offset, Offset0: offset0, Phi: phi, Most: most})
		if key.a < 0 && key.b < 0 { // its value is known, however large
			n.out.Exps[k].Most = math.Inf(1)
		}
	}
	e := &n.out.Exps[k]
	if e.A >= 0 || e.B >= 0 {
		e.Most = math.Min(e.Most, most)
	}
	return k
}

// term adds a coefficient of an exponential to a row.
func (n *neutral) term(row int32, k int, coef float64) {
	if int(row) == n.s.n || coef == 0 {
		return
	}
	r := &n.out.Rows[row]
	for i := range r.Exp {
		if r.Exp[i].At == k {
			r.Exp[i].Coef += coef
			return
		}
	}
	r.Exp = append(r.Exp, every.Term{At: k, Coef: coef})
}

func (n *neutral) junction(j *junction) error {
	if j.d.Shift != 0 {
		return fmt.Errorf("an idealised junction %w", ErrNoNeutral)
	}
	flow := func(k int, amps float64) { // from anode to cathode
		n.term(j.ra, k, amps)
		n.term(j.rk, k, -amps)
	}
	flow(n.exponential(j.a, j.k, 0, j.d.NVt/j.share, MostCurrent/j.d.Isat), j.d.Isat)
	if j.d.Zener {
		amps := j.d.Iz * j.d.Inv1mE0
		flow(n.exponential(j.k, j.a, j.d.Vz/j.share, j.d.NzVt/j.share, MostCurrent/amps), -amps)
	}
	return nil
}

func (n *neutral) bipolar(b *bipolar) error {
	if b.k.Shift != 0 {
		return fmt.Errorf("an idealised transistor %w", ErrNoNeutral)
	}
	base, collector, emitter := b.b, b.c, b.e
	forward := func(from, to int32) (int32, int32) { // the sense in which the junction conducts
		if b.sign < 0 {
			return to, from
		}
		return from, to
	}
	be1, be2 := forward(base, emitter)
	bc1, bc2 := forward(base, collector)
	k := &b.k
	phi := 1 / k.InvNVt
	f := n.exponential(be1, be2, 0, phi, MostCurrent/k.Isat)
	r := n.exponential(bc1, bc2, 0, phi, MostCurrent/k.Isat)
	// Terminal currents into the device, npn: Ic = Isat W - Isat yR/betaR, with
	// W = (yF - yR)(1 - u/VA); Ib as the model has it; Ie is minus their sum.
	ic := func(row int32, sign float64) {
		if k.InvVA == 0 {
			n.term(row, f, sign*k.Isat)
			n.term(row, r, -sign*k.Isat)
		}
		n.term(row, r, -sign*k.Isat*k.InvBetaR)
	}
	ib := func(row int32, sign float64) {
		n.term(row, f, sign*k.Isat*k.InvBetaF)
		n.term(row, r, sign*k.Isat*k.InvBetaR)
	}
	ic(b.rc, b.sign)
	ic(b.re, -b.sign)
	ib(b.rb, b.sign)
	ib(b.re, -b.sign)
	if k.Irec > 0 {
		rec := n.exponential(be1, be2, 0, 1/k.InvNrecVt, MostCurrent/k.Irec)
		n.term(b.rb, rec, b.sign*k.Irec)
		n.term(b.re, rec, -b.sign*k.Irec)
	}
	if k.InvVA > 0 {
		t := len(n.out.Prods)
		n.out.Prods = append(n.out.Prods, every.Product{F: f, R: r, Slope: k.InvVA})
		for _, side := range []struct {
			row  int32
			sign float64
		}{{b.rc, b.sign}, {b.re, -b.sign}} {
			if int(side.row) < n.s.n {
				row := &n.out.Rows[side.row]
				row.Prod = append(row.Prod, every.Term{At: t, Coef: side.sign * k.Isat})
			}
		}
	}
	return nil
}

// scope bounds the node voltages. Without current sources no node lies above the highest
// rail by more than the cells and fixed drops add up to, or below the lowest by as much:
// at a level beyond, that none of them spans, all current through the parts would flow one
// way, and none returns (no-gain property; A. N. Willson, Some aspects of the theory of
// nonlinear networks, Proc. IEEE 61, 1973, from memory). Current sources break that: there
// the bounds are a claim of the scope.
func (n *neutral) scope() Scope {
	s := n.s
	sc := Scope{Amps: MostCurrent, Proved: len(s.sources) == 0}
	for node, row := range s.row {
		if int(row) == s.n {
			sc.Low, sc.High = math.Min(sc.Low, s.full[node]), math.Max(sc.High, s.full[node])
		}
	}
	spans := 0.0
	low, high := map[int32]float64{}, map[int32]float64{}
	for node, row := range s.row {
		low[row], high[row] = math.Min(low[row], s.full[node]), math.Max(high[row], s.full[node])
	}
	for row := int32(0); int(row) < s.n; row++ {
		spans += high[row] - low[row]
	}
	if !sc.Proved {
		// What the sources could drive through all resistances in a row, so that the
		// point of a source into a resistor lies within; and some for junctions.
		const window = 100 // V; more than the drops of any bias network's junctions
		spans += window + s.driven()
	}
	sc.Low, sc.High = sc.Low-spans, sc.High+spans
	return sc
}

// driven is the sum of the sources' currents times that of the resistances, in V.
func (s *System) driven() float64 {
	amps, ohms := 0.0, 0.0
	for i := range s.sources {
		amps += math.Abs(s.sources[i].amps)
	}
	for i := range s.resistors {
		ohms += 1 / s.resistors[i].g
	}
	return amps * ohms
}
