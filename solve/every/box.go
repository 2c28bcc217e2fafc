package every

import (
	"math"

	"biaswright/solve/interval"
)

// A box is where a solution may lie: unknowns, and the exponentials' arguments.
type box struct{ x, u []interval.I }

func (b *box) clone() *box {
	return &box{append([]interval.I(nil), b.x...), append([]interval.I(nil), b.u...)}
}

// has tells whether a box of unknowns lies wholly within, and its arguments too.
func (b *box) has(s *System, x []interval.I) bool {
	for i := range x {
		if x[i].Lo < b.x[i].Lo || x[i].Hi > b.x[i].Hi {
			return false
		}
	}
	for k := range s.Exps {
		e := &s.Exps[k]
		if u := difference(x, e.A, e.B, e.Offset); u.Lo < b.u[k].Lo || u.Hi > b.u[k].Hi {
			return false
		}
	}
	return true
}

// start is the box that the search begins with.
func (s *System) start() *box {
	b := &box{append([]interval.I(nil), s.Start...), make([]interval.I, len(s.Exps))}
	for k := range s.Exps {
		e := &s.Exps[k]
		b.u[k] = difference(b.x, e.A, e.B, e.Offset).Meet(interval.I{Lo: math.Inf(-1), Hi: e.argument(interval.Of(e.Most)).Hi})
	}
	for t := range s.Prods { // the second factor is above 0
		p := &s.Prods[t]
		b.u[p.R] = b.u[p.R].Meet(interval.I{Lo: math.Inf(-1), Hi: interval.Up(1 / p.Slope)})
	}
	return b
}

// A propagator narrows boxes by one balance at a time; it holds scratch for one goroutine.
type propagator struct {
	s        *System
	b        *box
	y        []interval.I // of the exponentials
	moved    bool         // something became narrower by more than a twentieth
	empty    bool
	terms    []interval.I
	upto     []interval.I // sums of the terms before each
	products []interval.I
	factor   []interval.I // 1 - u Slope
}

func newPropagator(s *System) *propagator {
	return &propagator{s: s, y: make([]interval.I, len(s.Exps)), products: make([]interval.I, len(s.Prods)), factor: make([]interval.I, len(s.Prods))}
}

// narrow replaces an interval by what it shares with another.
func (p *propagator) narrow(a *interval.I, with interval.I) {
	m := a.Meet(with)
	if math.IsNaN(m.Lo) || math.IsNaN(m.Hi) { // no claim at all
		return
	}
	if m.Empty() {
		p.empty = true
		return
	}
	const enough = 0.95 // less is not worth another round
	if !(m.Width() >= enough*a.Width()) {
		p.moved = true
	}
	*a = m
}

// run narrows a box until nothing moves much; false if it is empty.
func (p *propagator) run(b *box) bool {
	p.b, p.empty = b, false
	const rounds = 60 // slow crawls are left to the other operators
	for range rounds {
		p.moved = false
		for k := range p.s.Exps {
			p.argument(k)
		}
		for t := range p.s.Prods {
			p.product(t)
		}
		for i := range p.s.Rows {
			p.row(&p.s.Rows[i])
			if p.empty {
				return false
			}
		}
		if p.empty {
			return false
		}
		if !p.moved {
			break
		}
	}
	return true
}

// argument ties u to the unknowns it is the difference of, and y to u.
func (p *propagator) argument(k int) {
	e, x := &p.s.Exps[k], p.b.x
	u := &p.b.u[k]
	p.narrow(u, difference(x, e.A, e.B, e.Offset))
	if e.A >= 0 {
		rest := u.Sub(interval.Of(e.Offset))
		if e.B >= 0 {
			rest = rest.Add(x[e.B])
		}
		p.narrow(&x[e.A], rest)
	}
	if e.B >= 0 {
		rest := interval.Of(e.Offset).Sub(*u)
		if e.A >= 0 {
			rest = rest.Add(x[e.A])
		}
		p.narrow(&x[e.B], rest)
	}
	p.y[k] = e.of(*u)
}

// reach narrows an exponential by what its y may be.
func (p *propagator) reach(k int, y interval.I) {
	m := p.y[k].Meet(y)
	if math.IsNaN(m.Lo) || math.IsNaN(m.Hi) {
		return
	}
	if m.Empty() {
		p.empty = true
		return
	}
	if m == p.y[k] {
		return
	}
	p.narrow(&p.b.u[k], p.s.Exps[k].argument(m))
	if !p.empty {
		p.y[k] = p.s.Exps[k].of(p.b.u[k]).Meet(m)
	}
}

func (p *propagator) product(t int) {
	q := &p.s.Prods[t]
	p.factor[t] = interval.Of(1).Sub(p.b.u[q.R].Scale(q.Slope)).Meet(interval.I{Lo: 0, Hi: math.Inf(1)})
	p.products[t] = p.y[q.F].Sub(p.y[q.R]).Mul(p.factor[t])
}

// factors narrows a product's factors by what the product may be.
func (p *propagator) factors(t int, w interval.I) {
	q := &p.s.Prods[t]
	m := p.products[t].Meet(w)
	if math.IsNaN(m.Lo) || math.IsNaN(m.Hi) {
		return
	}
	if m.Empty() {
		p.empty = true
		return
	}
	p.products[t] = m
	f := p.factor[t]
	if f.Lo <= 0 {
		return
	}
	transport := m.Div(f)
	p.reach(q.F, p.y[q.R].Add(transport))
	if !p.empty {
		p.reach(q.R, p.y[q.F].Sub(transport))
	}
	if p.empty {
		return
	}
	if d := p.y[q.F].Sub(p.y[q.R]); d.Lo > 0 || d.Hi < 0 {
		p.narrow(&p.b.u[q.R], interval.Of(1).Sub(m.Div(d)).Over(q.Slope))
	}
	if !p.empty {
		p.product(t)
	}
}

// row takes each term of a balance as minus the sum of the others.
func (p *propagator) row(r *Row) {
	p.terms = p.terms[:0]
	for _, t := range r.Lin {
		p.terms = append(p.terms, p.b.x[t.At].Scale(t.Coef))
	}
	for _, t := range r.Exp {
		p.terms = append(p.terms, p.y[t.At].Scale(t.Coef))
	}
	for _, t := range r.Prod {
		p.terms = append(p.terms, p.products[t.At].Scale(t.Coef))
	}
	p.upto = append(p.upto[:0], interval.Of(r.Const))
	for _, t := range p.terms {
		p.upto = append(p.upto, p.upto[len(p.upto)-1].Add(t))
	}
	after := interval.Of(0)
	lin, exp := len(r.Lin), len(r.Lin)+len(r.Exp)
	for i := len(p.terms) - 1; i >= 0 && !p.empty; i-- {
		rest := p.upto[i].Add(after).Neg()
		after = after.Add(p.terms[i])
		switch {
		case i >= exp:
			t := r.Prod[i-exp]
			p.factors(t.At, rest.Over(t.Coef))
		case i >= lin:
			t := r.Exp[i-lin]
			p.reach(t.At, rest.Over(t.Coef))
		default:
			t := r.Lin[i]
			p.narrow(&p.b.x[t.At], rest.Over(t.Coef))
		}
	}
}
