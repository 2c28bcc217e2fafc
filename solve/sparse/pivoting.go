package sparse

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// denseOrder is the largest order that Pivoting factorises as a dense matrix: at
// 128 that takes about 1.4 million multiply-subtracts, less than a millisecond.
const denseOrder = 128

// scalingPasses of Ruiz's method bring the largest entry of each row and column
// near 1; its error is squared away by each pass, and powers of two are coarse.
const scalingPasses = 6

// backwardLimit is the largest relative residual that a factorisation may leave
// on a system whose solution is known. Partial pivoting stays near 1e-16 unless
// its entries grow without need; ten digits are ample for a Newton step.
const backwardLimit = 1e-10

// Pivoting factorises matrices for which a plan's fixed order of pivots is not
// good enough. It scales rows and columns by powers of two, which rounds
// nothing, chooses pivots by size, and corrects every solution once by its
// residual (Skeel: one such step makes the error of each component small).
//
// It judges a factorisation by what it does to a known system and by finiteness,
// not by an estimate of the condition number: a badly scaled circuit has a huge
// one and is harmless.
//
// Literature: D. Ruiz, A scaling algorithm to equilibrate both rows and columns
// norms in matrices, Rutherford Appleton Laboratory report RAL-TR-2001-034;
// R. D. Skeel, Iterative refinement implies numerical stability for Gaussian
// elimination, Math. Comp. 35 (1980) 817-832.
type Pivoting struct {
	plan           *Plan
	rowOf, colOf   []int32   // of each value
	scaled         []float64 // 2^rowExp * value * 2^colExp
	rowExp, colExp []int
	most           []float64 // scaling: largest entry of rows, then of columns
	y, rhs         []float64
	core           core
}

// A core factorises the scaled matrix.
type core interface {
	factor(s *Pivoting) bool
	solve(x []float64, transposed bool)
	// det is the sign and the logarithm of the magnitude.
	det() (sign int, log float64)
}

// NewPivoting makes the workspace for factorisations with pivoting.
func (p *Plan) NewPivoting() *Pivoting {
	s := &Pivoting{
		plan:  p,
		rowOf: make([]int32, p.NNZ()), colOf: make([]int32, p.NNZ()),
		scaled: make([]float64, p.NNZ()),
		rowExp: make([]int, p.n), colExp: make([]int, p.n), most: make([]float64, 2*p.n),
		y: make([]float64, p.n), rhs: make([]float64, p.n),
	}
	for k := range p.n {
		pos := p.base(k)
		later := p.reach(k)
		s.rowOf[pos], s.colOf[pos] = p.rowOf[k], p.colOf[k]
		for i, j := range later {
			u, l := pos+1+int32(i), pos+1+int32(len(later)+i)
			s.rowOf[u], s.colOf[u] = p.rowOf[k], p.colOf[j]
			s.rowOf[l], s.colOf[l] = p.rowOf[j], p.colOf[k]
		}
	}
	if p.n <= denseOrder {
		s.core = newDense(p.n)
	} else {
		s.core = newLeftLooking(s)
	}
	return s
}

// Factor factorises the matrix with these values, of length NNZ. It is false if
// the matrix is not finite, is singular, or was factorised too inaccurately.
func (s *Pivoting) Factor(values []float64) (ok bool) {
	return s.scale(values) && s.core.factor(s) && s.proven()
}

// scale fills scaled; it is false if a row or column is all zeros or a value is
// not finite.
func (s *Pivoting) scale(values []float64) bool {
	clear(s.rowExp)
	clear(s.colExp)
	copy(s.scaled, values)
	rows, cols := s.most[:s.plan.n], s.most[s.plan.n:]
	for range scalingPasses {
		clear(s.most)
		for i, v := range s.scaled {
			v = math.Abs(v)
			if !(v <= math.MaxFloat64) {
				return false
			}
			r, c := s.rowOf[i], s.colOf[i]
			rows[r], cols[c] = max(rows[r], v), max(cols[c], v)
		}
		for k := range rows {
			if rows[k] == 0 || cols[k] == 0 {
				return false
			}
			_, e := math.Frexp(rows[k])
			s.rowExp[k] -= e / 2
			_, e = math.Frexp(cols[k])
			s.colExp[k] -= e / 2
		}
		for i, v := range values[:len(s.scaled)] {
			if v != 0 {
				s.scaled[i] = math.Ldexp(v, s.rowExp[s.rowOf[i]]+s.colExp[s.colOf[i]])
			}
		}
	}
	return true
}

// proven solves a system whose solution is 1, -1, 1, … and judges the residual.
func (s *Pivoting) proven() bool {
	for k := range s.y {
		s.y[k] = float64(1 - 2*(k&1))
	}
	clear(s.rhs)
	s.subtract(s.rhs, s.y, false)
	copy(s.y, s.rhs)
	s.core.solve(s.y, false)
	size := norm(s.rhs)
	s.subtract(s.rhs, s.y, false)
	// The scaled entries are of order 1, so that the solution's size measures
	// what was added up.
	return norm(s.rhs) <= backwardLimit*(size+norm(s.y))
}

// subtract takes S y, or Sᵀ y, from r.
func (s *Pivoting) subtract(r, y []float64, transposed bool) {
	to, from := s.rowOf, s.colOf
	if transposed {
		to, from = from, to
	}
	for i, v := range s.scaled {
		r[to[i]] -= v * y[from[i]]
	}
}

// Solve replaces b, of length Order, by the solution of A x = b.
func (s *Pivoting) Solve(b []float64) { s.solve(b, s.rowExp, s.colExp, false) }

// SolveT replaces b, of length Order, by the solution of Aᵀ x = b.
func (s *Pivoting) SolveT(b []float64) { s.solve(b, s.colExp, s.rowExp, true) }

func (s *Pivoting) solve(b []float64, in, out []int, transposed bool) {
	for k := range s.rhs {
		s.rhs[k] = math.Ldexp(b[k], in[k])
	}
	copy(s.y, s.rhs)
	s.core.solve(s.y, transposed)
	s.subtract(s.rhs, s.y, transposed)
	s.core.solve(s.rhs, transposed)
	for k := range s.y {
		b[k] = math.Ldexp(s.y[k]+s.rhs[k], out[k])
	}
}

// DetSign is the sign of the determinant, +1 or -1.
func (s *Pivoting) DetSign() int {
	sign, _ := s.core.det()
	return sign
}

// LogDet is the natural logarithm of the determinant's magnitude.
func (s *Pivoting) LogDet() float64 {
	_, log := s.core.det()
	for k := range s.rowExp {
		log -= math.Ln2 * float64(s.rowExp[k]+s.colExp[k])
	}
	return log
}

// norm is the maximum norm, NaN if v has one.
func norm(v []float64) float64 {
	m := 0.0
	for _, e := range v {
		m = max(m, math.Abs(e))
	}
	return m
}

// dense is gonum's LU with partial pivoting. Its condition estimate is left out:
// what matters here is judged by the residual.
type dense struct {
	a    blas64.General
	ipiv []int
	x    blas64.General
}

func newDense(n int) *dense {
	return &dense{
		a:    blas64.General{Rows: n, Cols: n, Stride: max(n, 1), Data: make([]float64, n*n)},
		ipiv: make([]int, n),
		x:    blas64.General{Rows: n, Cols: 1, Stride: 1},
	}
}

func (d *dense) factor(s *Pivoting) bool {
	clear(d.a.Data)
	for i, v := range s.scaled {
		d.a.Data[int(s.rowOf[i])*d.a.Stride+int(s.colOf[i])] = v
	}
	return lapack64.Getrf(d.a, d.ipiv)
}

func (d *dense) solve(x []float64, transposed bool) {
	t := blas.NoTrans
	if transposed {
		t = blas.Trans
	}
	d.x.Data = x
	lapack64.Getrs(t, d.a, d.x, d.ipiv)
}

func (d *dense) det() (sign int, log float64) {
	sign = 1
	for k, swapped := range d.ipiv {
		if swapped != k {
			sign = -sign
		}
		pivot := d.a.Data[k*d.a.Stride+k]
		if pivot < 0 {
			sign = -sign
		}
		log += math.Log(math.Abs(pivot))
	}
	return sign, log
}
