package mna

import (
	"math"

	"biaswright/solve/sparse"
	"biaswright/solve/twofold"
)

// A Precise is a System whose balances, Jacobian and steps are computed in
// twofold numbers. Nodes that hang together by ohms but are held by leakage alone
// (two reversed emitters in a row, between their bulk resistances) have balances
// that doubles cannot see: the leakage's conductance is below the rounding of the
// ohms'. A Precise sees them, and keeps the voltages' low-order parts between
// steps.
//
// It implements newton.System and uses its system's ramp, guards and numbers.
type Precise struct {
	*System
	x, next []twofold.Number // unknowns, of this and the next linearisation
	v       []twofold.Number // local node voltages
	f       []twofold.Number // balances, with a dump behind them
	jac     []twofold.Number // Jacobian, with a dump behind it
	factors *sparse.Doubled
}

// Precise makes the counterpart of s; it shares s's state.
func (s *System) Precise() *Precise {
	return &Precise{
		System: s,
		x:      make([]twofold.Number, s.n+1), next: make([]twofold.Number, s.n),
		v: make([]twofold.Number, s.nodes), f: make([]twofold.Number, s.n+1),
		jac: make([]twofold.Number, len(s.jac)), factors: s.plan.NewDoubled(),
	}
}

// follows is how many units in the last place an unknown may lie from the step
// that was given out and still be that step, rounded.
const follows = 4

// Linearise is System.Linearise, in twofold numbers. Where x is what the last
// Step led to, its low-order parts are remembered.
func (p *Precise) Linearise(x []float64) bool {
	for i, hi := range x {
		next := p.next[i]
		if math.Abs(next.Value()-hi) > follows*0x1p-52*math.Abs(hi) {
			next = twofold.Of(hi)
		}
		p.x[i] = next
	}
	// The plain evaluation guards the junctions and evaluates the models; what
	// follows only adds up anew.
	exact := p.System.Linearise(x)
	p.x[p.n] = twofold.Number{}
	for i, r := range p.row {
		p.v[i] = p.x[r].Add(twofold.Of(p.offset[i]))
	}
	clear(p.f)
	clear(p.jac)
	p.linear()
	for i := range p.junctions {
		j := &p.junctions[i]
		u := p.v[j.a].Sub(p.v[j.k])
		exponential, constant, breakdown := j.d.Terms(j.u)
		i := twofold.Sum(exponential, constant).Add(twofold.Of(breakdown))
		p.pair(j.ra, j.rk, j.p, i, j.g, u.Sub(twofold.Of(j.u).Div(twofold.Of(j.share))))
	}
	for i := range p.bipolars {
		p.bipolar(&p.bipolars[i])
	}
	return exact
}

// linear adds shunts, resistors and sources.
func (p *Precise) linear() {
	if g := p.ramp.Shunt; g != 0 {
		for i, at := range p.diagonal {
			tie := twofold.Of(g * p.tied[i])
			p.f[i] = p.x[i].Sub(twofold.Of(p.anchor[i])).Mul(tie)
			p.jac[at] = tie
		}
	}
	for i := range p.resistors {
		r := &p.resistors[i]
		p.pair(r.ra, r.rb, r.p, twofold.Number{}, r.g, p.v[r.a].Sub(p.v[r.b]))
	}
	for i := range p.sources {
		c := &p.sources[i]
		p.f[c.ra] = p.f[c.ra].Add(twofold.Of(c.i))
		p.f[c.rb] = p.f[c.rb].Sub(twofold.Of(c.i))
	}
}

// pair adds a two-terminal device of current i + g u.
func (p *Precise) pair(ra, rb int32, at [4]int32, i twofold.Number, g float64, u twofold.Number) {
	conductance := twofold.Of(g)
	i = i.Add(conductance.Mul(u))
	p.f[ra] = p.f[ra].Add(i)
	p.f[rb] = p.f[rb].Sub(i)
	p.jac[at[0]] = p.jac[at[0]].Add(conductance)
	p.jac[at[1]] = p.jac[at[1]].Sub(conductance)
	p.jac[at[2]] = p.jac[at[2]].Sub(conductance)
	p.jac[at[3]] = p.jac[at[3]].Add(conductance)
}

// bipolar adds a transistor, linearised where the plain evaluation put it.
func (p *Precise) bipolar(b *bipolar) {
	sign := func(x twofold.Number) twofold.Number {
		if b.sign < 0 {
			return x.Neg()
		}
		return x
	}
	de := sign(p.v[b.b].Sub(p.v[b.e])).Sub(twofold.Of(b.ube))
	dc := sign(p.v[b.b].Sub(p.v[b.c])).Sub(twofold.Of(b.ubc))
	along := func(i, ge, gc float64) twofold.Number {
		return sign(twofold.Of(i).Add(twofold.Of(ge).Mul(de)).Add(twofold.Of(gc).Mul(dc)))
	}
	ic := along(b.pt.Ic, b.pt.IcVbe, b.pt.IcVbc)
	ib := along(b.pt.Ib, b.pt.IbVbe, b.pt.IbVbc)
	p.f[b.rc] = p.f[b.rc].Add(ic)
	p.f[b.rb] = p.f[b.rb].Add(ib)
	p.f[b.re] = p.f[b.re].Sub(ic.Add(ib))
	c := [3]twofold.Number{twofold.Of(-b.pt.IcVbc), twofold.Sum(b.pt.IcVbe, b.pt.IcVbc), twofold.Of(-b.pt.IcVbe)}
	base := [3]twofold.Number{twofold.Of(-b.pt.IbVbc), twofold.Sum(b.pt.IbVbe, b.pt.IbVbc), twofold.Of(-b.pt.IbVbe)}
	for k := range 3 {
		p.jac[b.p[k]] = p.jac[b.p[k]].Add(c[k])
		p.jac[b.p[3+k]] = p.jac[b.p[3+k]].Add(base[k])
		p.jac[b.p[6+k]] = p.jac[b.p[6+k]].Sub(c[k].Add(base[k]))
	}
}

// Step solves J dx = -F and remembers where it leads.
func (p *Precise) Step(dx []float64) bool {
	p.Fallbacks++
	if !p.factors.Factor(p.jac[:len(p.jac)-1]) {
		return false
	}
	for i := range p.next {
		p.next[i] = p.f[i].Neg()
	}
	p.factors.Solve(p.next)
	for i, d := range p.next {
		dx[i] = d.Value()
		p.next[i] = p.x[i].Add(d)
	}
	return finite(dx)
}

// Balanced reports whether every balance of the last Linearise holds, by the same
// rule as System.Balanced.
func (p *Precise) Balanced() bool {
	p.tolerances()
	for i, f := range p.f[:p.n] {
		if !(math.Abs(f.Value()) <= p.tol[i]) {
			return false
		}
	}
	return true
}

// DetSign is System.DetSign at the last linearisation.
func (p *Precise) DetSign() int {
	if !p.factors.Factor(p.jac[:len(p.jac)-1]) {
		return 0
	}
	return p.factors.DetSign()
}

// solveTransposed is System.solveTransposed at the system's last evaluation.
func (p *Precise) solveTransposed(b []float64) bool {
	p.Linearise(append([]float64(nil), p.System.x[:p.n]...))
	if !p.factors.Factor(p.jac[:len(p.jac)-1]) {
		return false
	}
	wide := make([]twofold.Number, len(b))
	for i, v := range b {
		wide[i] = twofold.Of(v)
	}
	p.factors.SolveT(wide)
	for i, v := range wide {
		b[i] = v.Value()
	}
	return true
}
