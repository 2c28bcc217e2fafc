package sparse

import (
	"math"

	"biaswright/solve/twofold"
)

// Doubled factorises matrices of a plan, in the plan's order, in numbers of twice
// a double's precision. It is for matrices in which doubles lose what holds a
// part of the network; it takes some thirty times as long as Factors.
type Doubled struct {
	plan *Plan
	a    []twofold.Number // L (unit diagonal left out), U, pivots
	w    []twofold.Number
}

// NewDoubled makes the workspace for one factorisation.
func (p *Plan) NewDoubled() *Doubled {
	return &Doubled{plan: p, a: make([]twofold.Number, p.NNZ()), w: make([]twofold.Number, p.n)}
}

// smallDoubled is smallPivot's counterpart: a pivot that cancellation has brought
// below it keeps too few digits to tell it from 0.
const smallDoubled = 0x1p-95

// Factor runs the elimination over values, of length NNZ. It is false where a
// pivot vanishes or is not finite.
func (f *Doubled) Factor(values []twofold.Number) (ok bool) {
	p, a := f.plan, f.a
	copy(a, values)
	for k := range p.steps {
		base := int(p.base(k))
		pivot, entry := a[base], math.Abs(values[base].Hi)
		size := math.Abs(pivot.Hi)
		if !(size > smallDoubled*entry+tinyPivot) || math.IsInf(size, 0) {
			return false
		}
		later := p.reach(k)
		upper := a[base+1 : base+1+len(later)]
		lower := a[base+1+len(later) : base+1+2*len(later)]
		for i, l := range lower {
			lower[i] = l.Div(pivot)
		}
		f.update(later, lower, upper)
	}
	return true
}

// update subtracts the products of a pivot's column and row from what it reaches.
func (f *Doubled) update(later []int32, lower, upper []twofold.Number) {
	p, a := f.plan, f.a
	for i, pivot := range later {
		reach := p.reach(int(pivot))
		at := int(p.base(int(pivot)))
		l, u := lower[i], upper[i]
		a[at] = a[at].Sub(l.Mul(u))
		row := a[at+1 : at+1+len(reach)]
		col := a[at+1+len(reach) : at+1+2*len(reach)]
		q := 0
		for j := i + 1; j < len(later); j++ {
			for reach[q] != later[j] {
				q++
			}
			row[q] = row[q].Sub(l.Mul(upper[j]))
			col[q] = col[q].Sub(lower[j].Mul(u))
		}
	}
}

// Solve replaces b, of length Order, by the solution of A x = b.
func (f *Doubled) Solve(b []twofold.Number) {
	p, a, w := f.plan, f.a, f.w
	for k, row := range p.rowOf {
		w[k] = b[row]
	}
	for k := range p.steps {
		later := p.reach(k)
		lower := a[int(p.base(k))+1+len(later):]
		for i, j := range later {
			w[j] = w[j].Sub(lower[i].Mul(w[k]))
		}
	}
	for k := len(p.steps) - 1; k >= 0; k-- {
		later := p.reach(k)
		upper := a[p.base(k)+1:]
		x := w[k]
		for i, j := range later {
			x = x.Sub(upper[i].Mul(w[j]))
		}
		w[k] = x.Div(a[p.base(k)])
		b[p.colOf[k]] = w[k]
	}
}

// SolveT replaces b, of length Order, by the solution of Aᵀ x = b.
func (f *Doubled) SolveT(b []twofold.Number) {
	p, a, w := f.plan, f.a, f.w
	for k, col := range p.colOf {
		w[k] = b[col]
	}
	for k := range p.steps {
		later := p.reach(k)
		upper := a[p.base(k)+1:]
		w[k] = w[k].Div(a[p.base(k)])
		for i, j := range later {
			w[j] = w[j].Sub(upper[i].Mul(w[k]))
		}
	}
	for k := len(p.steps) - 1; k >= 0; k-- {
		later := p.reach(k)
		lower := a[int(p.base(k))+1+len(later):]
		x := w[k]
		for i, j := range later {
			x = x.Sub(lower[i].Mul(w[j]))
		}
		w[k] = x
		b[p.rowOf[k]] = x
	}
}

// DetSign is the sign of the determinant, +1 or -1.
func (f *Doubled) DetSign() int {
	sign := f.plan.parity
	for k := range f.plan.steps {
		if f.a[f.plan.base(k)].Hi < 0 {
			sign = -sign
		}
	}
	return sign
}
