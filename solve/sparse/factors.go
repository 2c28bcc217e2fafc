package sparse

import "math"

// A Solver factorises matrices of one plan and solves with the last one. Factors
// and Pivoting are Solvers.
type Solver interface {
	// Factor factorises the matrix whose values stand at the plan's positions
	// and keeps no reference to them. Without success, nothing else may be
	// called before the next Factor.
	Factor(values []float64) (ok bool)
	// Solve replaces b by the solution of A x = b.
	Solve(b []float64)
	// SolveT replaces b by the solution of Aᵀ x = b.
	SolveT(b []float64)
	// DetSign is the sign of det A, +1 or -1.
	DetSign() int
	// LogDet is ln |det A|.
	LogDet() float64
}

var (
	_ Solver = (*Factors)(nil)
	_ Solver = (*Pivoting)(nil)
)

// A pivot p that started as the entry d must keep within
//
//	smallPivot |d| < |p| < |d| / smallPivot.
//
// Below, cancellation has left the pivot fewer than three good digits, with
// which a Newton step would hardly contract; above, growth has swamped as many
// digits of the entry. A pivot whose entry is 0 fails, and so does a matrix with
// an infinity or a NaN: the fill is symmetric, so that an entry which is not
// finite reaches a later diagonal.
const smallPivot = 0x1p-42

// tinyPivot keeps the reciprocal of a pivot far from overflow.
const tinyPivot = 0x1p-1000

// Factors is the factorisation A = L D U of one matrix of a plan, rows and
// columns in the plan's order, L and U with unit diagonals. Its methods do not
// allocate.
//
// Both triangles are scaled because of small systems: there the time goes by the
// chain of operations that wait for each other, and a product with a reciprocal
// pivot leaves that chain in elimination and in both substitutions.
type Factors struct {
	plan *Plan
	a    []float64 // at the plan's positions: L, U, and 1/D on the diagonal
	w    []float64 // right-hand side in pivot order
}

// NewFactors makes the workspace for one factorisation.
func (p *Plan) NewFactors() *Factors {
	return &Factors{plan: p, a: make([]float64, p.NNZ()), w: make([]float64, p.n)}
}

// Factor runs the elimination over values, of length NNZ. It is false if a pivot
// left the bounds described at the constant smallPivot: then use Pivoting.
func (f *Factors) Factor(values []float64) (ok bool) {
	p := f.plan
	a := f.a
	values = values[:len(a)]
	copy(a, values)
	for k := range p.steps {
		s := &p.steps[k]
		d := math.Abs(values[s.diag])
		pivot := a[s.diag]
		size := math.Abs(pivot)
		if !(size > smallPivot*d+tinyPivot) || !(smallPivot*size < d) {
			return false
		}
		r := 1 / pivot
		a[s.diag] = r
		switch m := s.reach; {
		case m == 0:
		case m == 1:
			pair := a[s.diag+1:][:2]
			u, l := pair[0], pair[1]
			a[s.first] -= l * u * r
			pair[0], pair[1] = u*r, l*r
		case m <= wideReach:
			upper := a[s.diag+1:][:2*m]
			lower := upper[m:]
			for i := range lower {
				lower[i] *= r
			}
			for _, o := range p.ops[s.ops:s.opsEnd] {
				a[o.target] -= a[o.lower] * a[o.upper]
			}
			for i := range upper[:m] {
				upper[i] *= r
			}
		default:
			f.wide(k, r)
		}
	}
	return true
}

// wide eliminates pivot k, whose updates are not spelled out. Of a later pivot
// it reaches, row and column change at the same places.
func (f *Factors) wide(k int, r float64) {
	p := f.plan
	later := p.reach(k)
	m := len(later)
	base := int(p.base(k))
	upper := f.a[base+1 : base+1+m]
	lower := f.a[base+1+m : base+1+2*m]
	for i := range lower {
		lower[i] *= r
	}
	for i, pivot := range later {
		reach := p.reach(int(pivot))
		at := int(p.base(int(pivot)))
		l, u := lower[i], upper[i]
		f.a[at] -= l * u
		row := f.a[at+1 : at+1+len(reach)]
		col := f.a[at+1+len(reach) : at+1+2*len(reach)]
		q := 0
		for j := i + 1; j < m; j++ {
			for reach[q] != later[j] {
				q++
			}
			row[q] -= l * upper[j]
			col[q] -= lower[j] * u
		}
	}
	for i := range upper {
		upper[i] *= r
	}
}

// Solve replaces b, of length Order, by the solution of A x = b.
func (f *Factors) Solve(b []float64) {
	f.substitute(b, f.plan.rowOf, f.plan.colOf, 0, 1)
}

// SolveT replaces b, of length Order, by the solution of Aᵀ x = b.
func (f *Factors) SolveT(b []float64) {
	f.substitute(b, f.plan.colOf, f.plan.rowOf, 1, 0)
}

// substitute solves with L, D and U, or with Uᵀ, D and Lᵀ: up and down are 0 for
// U and 1 for L, and say which triangle the backward and the forward pass use.
func (f *Factors) substitute(b []float64, from, to []int32, up, down int32) {
	p := f.plan
	a := f.a
	w := f.w[:len(from)]
	for k, i := range from {
		w[k] = b[i]
	}
	at := int32(0)
	steps := p.steps[:len(w)]
	for k := range steps {
		s := &steps[k]
		m := s.reach
		x := w[k]
		if m == 1 {
			w[p.later[at]] -= a[s.diag+1+down] * x
			at++
			continue
		}
		triangle := a[s.diag+1+down*m:][:m]
		for i, j := range p.later[at:][:m] {
			w[j] -= triangle[i] * x
		}
		at += m
	}
	to = to[:len(w)]
	for k := len(w) - 1; k >= 0; k-- {
		s := &steps[k]
		m := s.reach
		x := w[k] * a[s.diag]
		at -= m
		if m == 1 {
			x -= a[s.diag+1+up] * w[p.later[at]]
		} else {
			triangle := a[s.diag+1+up*m:][:m]
			for i, j := range p.later[at:][:m] {
				x -= triangle[i] * w[j]
			}
		}
		w[k] = x
		b[to[k]] = x
	}
}

// DetSign is the sign of the determinant, +1 or -1.
func (f *Factors) DetSign() int {
	sign := f.plan.parity
	for k := range f.plan.steps {
		if f.a[f.plan.steps[k].diag] < 0 {
			sign = -sign
		}
	}
	return sign
}

// LogDet is the natural logarithm of the determinant's magnitude.
func (f *Factors) LogDet() float64 {
	sum := 0.0
	for k := range f.plan.steps {
		sum -= math.Log(math.Abs(f.a[f.plan.steps[k].diag]))
	}
	return sum
}
