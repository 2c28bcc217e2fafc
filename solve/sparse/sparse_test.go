package sparse

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// A system is a matrix for tests: entries with values.
type system struct {
	n       int
	entries []Entry
	values  []float64
}

func (s *system) add(row, col int, v float64) {
	s.entries, s.values = append(s.entries, Entry{row, col}), append(s.values, v)
}

// conduct joins two nodes by a conductance; node -1 is ground.
func (s *system) conduct(a, b int, g float64) {
	for _, end := range [][2]int{{a, b}, {b, a}} {
		if end[0] < 0 {
			continue
		}
		s.add(end[0], end[0], g)
		if end[1] >= 0 {
			s.add(end[0], end[1], -g)
		}
	}
}

func (s *system) dense() *mat.Dense {
	d := mat.NewDense(s.n, s.n, nil)
	for i, e := range s.entries {
		d.Set(e.Row, e.Col, d.At(e.Row, e.Col)+s.values[i])
	}
	return d
}

// place sums the values into a slice at the plan's positions.
func (s *system) place(p *Plan) []float64 {
	values := make([]float64, p.NNZ())
	for i, e := range s.entries {
		values[p.Index(e.Row, e.Col)] += s.values[i]
	}
	return values
}

func (s *system) plan(t testing.TB) *Plan {
	t.Helper()
	p, err := Analyse(s.n, s.entries)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// residual is the backward error of x in A x = b, or Aᵀ x = b, by components:
// |A x - b| over |A| |x| + |b| (Oettli and Prager 1964), the largest.
func (s *system) residual(x, b []float64, transposed bool) float64 {
	r, size := make([]float64, s.n), make([]float64, s.n)
	for i, v := range b {
		r[i], size[i] = -v, math.Abs(v)
	}
	for i, e := range s.entries {
		if transposed {
			e.Row, e.Col = e.Col, e.Row
		}
		r[e.Row] += s.values[i] * x[e.Col]
		size[e.Row] += math.Abs(s.values[i] * x[e.Col])
	}
	worst := 0.0
	for i := range r {
		if size[i] > 0 {
			worst = max(worst, math.Abs(r[i])/size[i])
		}
	}
	return worst
}

// w1 has the shape of a lamp sink: bias, a node between two diodes, two lamps
// each with an inner node, the collector, the emitter.
func w1() *system {
	s := &system{n: 7}
	s.conduct(0, -1, 1/1800.0)
	s.conduct(0, 1, 0.12)
	s.conduct(1, -1, 0.12)
	s.conduct(2, -1, 0.2)
	s.conduct(2, 3, 0.2)
	s.conduct(3, 4, 0.2)
	s.conduct(4, 5, 0.19)
	s.conduct(6, -1, 1/47.0)
	s.conduct(0, 6, 0.002)
	s.conduct(5, 6, 1e-4)
	s.conduct(5, 0, 1e-12)
	s.add(5, 0, 0.4)
	s.add(5, 6, -0.4)
	s.add(6, 0, -0.4)
	s.add(6, 6, 0.4)
	return s
}

// ladder has n nodes in a chain, each with a conductance to ground.
func ladder(n int) *system {
	s := &system{n: n}
	for i := range n {
		s.conduct(i, i-1, 1)
		s.conduct(i, -1, 0.01)
	}
	return s
}

// anySystem draws a square system with a dominant diagonal and, if sources is
// set, a few ideal sources: rows whose diagonal is missing.
func anySystem(t *rapid.T, most int, sources bool) *system {
	nodes := rapid.IntRange(1, most).Draw(t, "nodes")
	rnd := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
	s := &system{n: nodes}
	decades := func() float64 { return math.Pow(10, -4+6*rnd.Float64()) }
	for i := range nodes {
		s.conduct(i, rnd.IntN(i+1)-1, decades())
		for range rnd.IntN(3) {
			if j := rnd.IntN(nodes); j != i {
				g := decades()
				s.conduct(i, j, g)
				// A transconductance below g keeps the diagonal dominant.
				s.add(i, j, 0.5*g*rnd.Float64())
			}
		}
	}
	if !sources {
		return s
	}
	for node := rnd.IntN(3); node < nodes; node += 2 + rnd.IntN(4) {
		branch := s.n
		s.n++
		s.add(node, branch, 1)
		s.add(branch, node, 1)
		if node > 0 && rnd.IntN(2) == 0 {
			s.add(node-1, branch, -1)
			s.add(branch, node-1, -1)
		}
	}
	return s
}

func draw(n int, seed uint64) []float64 {
	rnd := rand.New(rand.NewPCG(seed, 2))
	b := make([]float64, n)
	for i := range b {
		b[i] = 2*rnd.Float64() - 1
	}
	return b
}

// check compares a solver with gonum's dense LU in residual, transposed
// residual, the adjoint identity and the determinant. tol is the backward error
// allowed.
func check(t fataler, s *system, f Solver, tol float64) {
	t.Helper()
	b, c := draw(s.n, 7), draw(s.n, 8)
	x, y := append([]float64(nil), b...), append([]float64(nil), c...)
	f.Solve(x)
	f.SolveT(y)
	if r := s.residual(x, b, false); !(r < tol) {
		t.Fatalf("n=%d: residual %g", s.n, r)
	}
	if r := s.residual(y, c, true); !(r < tol) {
		t.Fatalf("n=%d: transposed residual %g", s.n, r)
	}
	// cᵀ A⁻¹ b two ways.
	var left, right, size float64
	for i := range b {
		left += c[i] * x[i]
		right += y[i] * b[i]
		size += math.Abs(c[i]*x[i]) + math.Abs(y[i]*b[i])
	}
	// A backward error grows by the condition number in the solution, which the
	// systems below keep under 1e6.
	if math.Abs(left-right) > 1e6*tol*size {
		t.Fatalf("n=%d: adjoint identity %g against %g", s.n, left, right)
	}
	var lu mat.LU
	lu.Factorize(s.dense())
	log, sign := lu.LogDet()
	if f.DetSign() != int(sign) || math.Abs(f.LogDet()-log) > 1e6*tol {
		t.Fatalf("n=%d: determinant %d exp(%g), want %g exp(%g)", s.n, f.DetSign(), f.LogDet(), sign, log)
	}
}

type fataler interface {
	Helper()
	Fatalf(format string, args ...any)
}

// pivotedTol is for elimination with pivoting or on a dominant diagonal: some
// hundred roundings. looseTol is what the bounds on pivots guarantee for the
// rest: three digits in the worst case.
const (
	pivotedTol = 1e-13
	looseTol   = 1e-3
)

func TestRandomSystems(t *testing.T) {
	for _, sources := range []bool{false, true} {
		t.Run(fmt.Sprintf("sources=%t", sources), func(t *testing.T) {
			total, refused := 0, 0
			rapid.Check(t, func(t *rapid.T) {
				s := anySystem(t, 60, sources)
				p, err := Analyse(s.n, s.entries)
				if err != nil {
					t.Fatal(err)
				}
				values := s.place(p)
				f := p.NewFactors()
				total++
				tol := pivotedTol
				if sources {
					tol = looseTol
				}
				if f.Factor(values) {
					check(t, s, f, tol)
				} else {
					refused++
				}
				pivoting := p.NewPivoting()
				if !pivoting.Factor(values) {
					t.Fatal("pivoting refused a regular system")
				}
				check(t, s, pivoting, pivotedTol)
				pivoting.core = newLeftLooking(pivoting)
				if !pivoting.Factor(values) {
					t.Fatal("sparse pivoting refused a regular system")
				}
				check(t, s, pivoting, pivotedTol)
			})
			// The fixed order is the ordinary way, not the exception: it refuses
			// about three in a hundred of these, and a quarter by no chance.
			if refused*4 > total {
				t.Errorf("the fixed order refused %d of %d", refused, total)
			}
		})
	}
}

// Any matrix, dominant or not: what Factor accepts, it solves; the pivoting ways
// agree with gonum.
func TestUnruly(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 25).Draw(t, "n")
		rnd := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 3))
		s := &system{n: n}
		perm := rnd.Perm(n)
		for i := range n {
			s.add(i, perm[i], 1+rnd.Float64()) // regular in structure
			for range rnd.IntN(4) {
				s.add(i, rnd.IntN(n), 2*rnd.Float64()-1)
			}
		}
		p, err := Analyse(s.n, s.entries)
		if err != nil {
			t.Fatal(err)
		}
		values := s.place(p)
		pivoting := p.NewPivoting()
		if cond := mat.Cond(s.dense(), 1); cond > 1e6 {
			t.Skip("ill-conditioned")
		}
		for _, core := range []core{newDense(n), newLeftLooking(pivoting)} {
			pivoting.core = core
			if !pivoting.Factor(values) {
				t.Fatalf("%T refused a regular system", core)
			}
			check(t, s, pivoting, pivotedTol)
		}
	})
}

// Conductances from 1e-18 S to 1e3 S beside each other, and rows in odd units.
func TestIllScaled(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 40).Draw(t, "n")
		rnd := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 4))
		s := &system{n: n}
		// A large conductance between two nodes that are held by small ones alone
		// would be singular in double precision: neighbours are joined by less
		// than what holds the weaker one.
		before := 1e3
		for i := range n {
			g := math.Pow(10, -18+21*rnd.Float64())
			s.conduct(i, -1, g)
			s.conduct(i, i-1, min(g, before)*rnd.Float64())
			before = g
		}
		p, err := Analyse(s.n, s.entries)
		if err != nil {
			t.Fatal(err)
		}
		values := s.place(p)
		b := draw(n, 5)
		solvers := []Solver{p.NewFactors(), p.NewPivoting()}
		for _, f := range solvers {
			if !f.Factor(values) {
				t.Fatalf("%T refused", f)
			}
			x := append([]float64(nil), b...)
			f.Solve(x)
			// A dominant matrix with signs like these: elimination in any order
			// of the diagonal is backward stable.
			if r := s.residual(x, b, false); !(r < pivotedTol) {
				t.Fatalf("%T: residual %g", f, r)
			}
			if f.DetSign() != 1 {
				t.Fatalf("%T: a passive network has a positive determinant", f)
			}
		}
	})
}

func TestStructurallySingular(t *testing.T) {
	_, err := Analyse(3, []Entry{{0, 0}, {1, 1}, {1, 0}, {2, 0}, {2, 1}, {0, 1}})
	var singular *SingularError
	if !errors.As(err, &singular) || singular.Row != 2 || singular.Col != 2 {
		t.Fatalf("got %v", err)
	}
	if _, err := Analyse(2, []Entry{{0, 2}}); err == nil {
		t.Fatal("an entry outside was accepted")
	}
}

func TestRefusals(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	tests := []struct {
		name           string
		a              [2][2]float64
		fixed, pivoted bool
	}{
		{"plain", [2][2]float64{{2, 1}, {1, 2}}, true, true},
		{"singular", [2][2]float64{{1, 1}, {1, 1}}, false, false},
		{"zero", [2][2]float64{{0, 0}, {0, 0}}, false, false},
		{"zero diagonal", [2][2]float64{{0, 1}, {1, 0}}, false, true},
		// 1 - 1e20 swamps the 1: growth, for which the fixed order has no cure.
		{"growth", [2][2]float64{{1e-20, 1}, {1, 1}}, false, true},
		// det = 1e-15: the second pivot is what cancellation left.
		{"cancellation", [2][2]float64{{1, 1}, {1, 1 + 1e-15}}, false, true},
		{"scaled", [2][2]float64{{2e-100, 1e-100}, {1e100, 2e100}}, true, true},
		{"NaN first", [2][2]float64{{nan, 1}, {1, 2}}, false, false},
		{"NaN above", [2][2]float64{{1, nan}, {1, 2}}, false, false},
		{"NaN below", [2][2]float64{{1, 1}, {nan, 2}}, false, false},
		{"NaN last", [2][2]float64{{1, 1}, {1, nan}}, false, false},
		{"infinite first", [2][2]float64{{inf, 1}, {1, 2}}, false, false},
		{"infinite above", [2][2]float64{{1, inf}, {0, 2}}, false, false},
		{"infinite last", [2][2]float64{{1, 1}, {1, inf}}, false, false},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			s := &system{n: 2}
			for i, row := range test.a {
				for j, v := range row {
					s.add(i, j, v)
				}
			}
			p := s.plan(t)
			values := s.place(p)
			if got := p.NewFactors().Factor(values); got != test.fixed {
				t.Errorf("Factors: %t", got)
			}
			pivoting := p.NewPivoting()
			for _, core := range []core{newDense(2), newLeftLooking(pivoting)} {
				pivoting.core = core
				if got := pivoting.Factor(values); got != test.pivoted {
					t.Errorf("%T: %t", core, got)
				}
			}
		})
	}
}

// A grid fills in beyond wideReach, so both forms of elimination run.
func TestGrid(t *testing.T) {
	const side = 32
	s := &system{n: side * side}
	for i := range side {
		for j := range side {
			at := i*side + j
			s.conduct(at, -1, 1e-3)
			if i > 0 {
				s.conduct(at, at-side, 1+0.1*float64(j%7))
			}
			if j > 0 {
				s.conduct(at, at-1, 1+0.1*float64(i%5))
			}
		}
	}
	p := s.plan(t)
	wide := false
	for _, st := range p.steps {
		wide = wide || st.reach > wideReach
	}
	if !wide {
		t.Fatal("no wide pivot: the test misses its purpose")
	}
	// Nested dissection needs 31 n log2(n) / 4 entries of L (George 1973);
	// minimum degree is known to do about as well.
	if limit := int(31 * float64(s.n) * math.Log2(float64(s.n)) / 4); p.NNZ() > 2*limit {
		t.Errorf("fill %d above %d", p.NNZ(), 2*limit)
	}
	for _, f := range []Solver{p.NewFactors(), p.NewPivoting()} {
		if !f.Factor(s.place(p)) {
			t.Fatalf("%T refused", f)
		}
		check(t, s, f, pivotedTol)
	}
}

// Work on a chain grows with its length: counted, not timed.
func TestGrowth(t *testing.T) {
	count := func(s *system) float64 {
		p := s.plan(t)
		return float64(p.Updates() + p.NNZ())
	}
	small, large := count(ladder(30)), count(ladder(3000))
	if exponent := math.Log(large/small) / math.Log(100); exponent > 1.1 {
		t.Errorf("exponent %.3f", exponent)
	}
	if p := ladder(3000).plan(t); p.NNZ() != 3*3000-2 {
		t.Errorf("a chain needs no fill, got %d values", p.NNZ())
	}
	// A line that feeds every stage is eliminated last and costs little.
	bus := ladder(10000)
	bus.n++
	for i := range 10000 {
		bus.conduct(i, 10000, 0.1)
	}
	bus.conduct(10000, -1, 1)
	if p := bus.plan(t); p.NNZ() > 10*bus.n {
		t.Errorf("a chain with a bus: %d values", p.NNZ())
	}
}

func TestAllocations(t *testing.T) {
	for _, s := range []*system{w1(), ladder(300)} {
		p := s.plan(t)
		values, b := s.place(p), draw(s.n, 1)
		for _, f := range []Solver{p.NewFactors(), p.NewPivoting()} {
			f.Factor(values) // Pivoting grows its columns the first time
			if allocs := testing.AllocsPerRun(20, func() {
				f.Factor(values)
				f.Solve(b)
				f.SolveT(b)
				f.DetSign()
			}); allocs != 0 {
				t.Errorf("n=%d %T: %g allocations", s.n, f, allocs)
			}
		}
	}
}

func TestEmpty(t *testing.T) {
	p, err := Analyse(0, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range []Solver{p.NewFactors(), p.NewPivoting()} {
		if !f.Factor(nil) || f.DetSign() != 1 || f.LogDet() != 0 {
			t.Errorf("%T: the empty determinant is 1", f)
		}
		f.Solve(nil)
		f.SolveT(nil)
	}
}

func BenchmarkFactorSolve(b *testing.B) {
	for _, s := range []*system{w1(), ladder(30), ladder(3000)} {
		p := s.plan(b)
		values, right, x := s.place(p), draw(s.n, 1), draw(s.n, 1)
		f := p.NewFactors()
		b.Run(fmt.Sprintf("factor/n=%d", s.n), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				f.Factor(values)
			}
		})
		f.Factor(values)
		b.Run(fmt.Sprintf("solve/n=%d", s.n), func(b *testing.B) {
			for b.Loop() {
				copy(x, right)
				f.Solve(x)
			}
		})
	}
}

func BenchmarkAnalyse(b *testing.B) {
	for _, n := range []int{30, 3000, 10000} {
		s := ladder(n)
		b.Run(fmt.Sprintf("n=%d", n), func(b *testing.B) {
			for b.Loop() {
				s.plan(b)
			}
		})
	}
}
