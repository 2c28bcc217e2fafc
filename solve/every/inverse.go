package every

import "math"

// eps bounds the relative error of one rounding (2^-53), with a little reserve for the
// roundings of the bounds themselves.
const eps = 1.2e-16

// invert replaces a, n by n in rows, by an approximate inverse; false where no pivot is
// left. Pivots are chosen by their size relative to their row, since rows of currents
// differ by many powers of ten. What the inverse is worth, the caller must bound.
func invert(a []float64, n int) bool {
	scale := make([]float64, n)
	order := make([]int, n)
	for i := range n {
		order[i] = i
		for j := range n {
			scale[i] = math.Max(scale[i], math.Abs(a[i*n+j]))
		}
		if !(scale[i] > 0) || math.IsInf(scale[i], 0) {
			return false
		}
	}
	for k := range n { // Gauss-Jordan in place
		best, at := 0.0, -1
		for i := k; i < n; i++ {
			if v := math.Abs(a[i*n+k]) / scale[i]; v > best {
				best, at = v, i
			}
		}
		if at < 0 {
			return false
		}
		if at != k {
			for j := range n {
				a[at*n+j], a[k*n+j] = a[k*n+j], a[at*n+j]
			}
			scale[at], scale[k] = scale[k], scale[at]
			order[at], order[k] = order[k], order[at]
		}
		row := a[k*n : k*n+n]
		d := 1 / row[k]
		row[k] = 1
		for j := range row {
			row[j] *= d
		}
		for i := range n {
			f := a[i*n+k]
			if i == k || f == 0 {
				continue
			}
			other := a[i*n : i*n+n]
			other[k] = 0
			for j := range other {
				other[j] -= f * row[j]
			}
		}
	}
	// Row exchanges of the matrix are column exchanges of its inverse.
	line := make([]float64, n)
	for i := range n {
		for k := range n {
			line[order[k]] = a[i*n+k]
		}
		copy(a[i*n:], line)
	}
	return true
}

// A param is one uncertain slope: a column of coefficients times a slope times the
// difference of two unknowns.
type param struct {
	col  []Term
	a, b int // the difference x[a] - x[b]
}

// A centre is a real matrix M = G + Σ slope col ⊗ difference, with an approximate inverse
// C and bounds on what that is worth.
type centre struct {
	n      int
	c      []float64 // C
	absM   []float64 // Σ of the magnitudes of what adds up to each entry of M
	defect float64   // a bound of the largest row sum of |I - C M|, M exact
	size   float64   // the largest row sum of |C| absM
}

// newCentre builds and inverts; false where M is singular or the inverse worth nothing.
func (s *System) newCentre(params []param, slopes []float64) (*centre, bool) {
	t, m, ok := s.inverse(params, slopes)
	return t, ok && s.bound(t, m)
}

// inverse builds M and an approximate inverse, without a bound of what it is worth.
func (s *System) inverse(params []param, slopes []float64) (t *centre, m []float64, ok bool) {
	n := s.N
	m = make([]float64, n*n)
	t = &centre{n: n, absM: make([]float64, n*n)}
	add := func(i, j int, v float64) {
		if j >= 0 {
			m[i*n+j] += v
			t.absM[i*n+j] += math.Abs(v)
		}
	}
	for i := range s.Rows {
		for _, l := range s.Rows[i].Lin {
			add(i, l.At, l.Coef)
		}
	}
	for k := range params {
		p := &params[k]
		for _, q := range p.col {
			v := q.Coef * slopes[k]
			add(q.At, p.a, v)
			add(q.At, p.b, -v)
		}
	}
	t.c = append([]float64(nil), m...)
	return t, m, invert(t.c, n)
}

// bound fills in what the inverse is worth; false where that is nothing.
func (s *System) bound(t *centre, m []float64) bool {
	n := s.N
	// Each entry of M is a sum of at most as many terms as its row has; with the n terms
	// of the product that bounds the roundings.
	roundings := (s.longest() + float64(n) + 4) * eps
	line, size := make([]float64, n), make([]float64, n)
	for i := range n {
		clear(line)
		clear(size)
		line[i] = -1
		for k := range n {
			f := t.c[i*n+k]
			if f == 0 {
				continue
			}
			g := math.Abs(f)
			row, abs := m[k*n:k*n+n], t.absM[k*n:k*n+n]
			for j := range line {
				line[j] += f * row[j]
				size[j] += g * abs[j]
			}
		}
		sum := 0.0
		for j := range line {
			sum += math.Abs(line[j]) + roundings*size[j]
		}
		t.defect = math.Max(t.defect, sum*(1+float64(4*n)*eps))
		all := 0.0
		for _, v := range size {
			all += v
		}
		t.size = math.Max(t.size, all)
	}
	const most = 0.1 // beyond it the corrections below are no small ones
	return t.defect < most
}

// longest is how many terms the longest row has.
func (s *System) longest() float64 {
	n := 0
	for i := range s.Rows {
		r := &s.Rows[i]
		n = max(n, len(r.Lin)+2*len(r.Exp)+4*len(r.Prod))
	}
	return float64(n)
}

// A spread is C times columns, as they act on the unknowns and on differences of them.
type spread struct {
	move []float64 // by column and unknown: C col
	big  []float64 // by column: the largest magnitude of move
	// size is, by column and unknown, Σ |C| |col|, larger for columns of more than
	// terms entries, so that move is within terms eps size of what is exact.
	size []float64
}

// terms is how many roundings each part of a move is reckoned to go through: what its
// users state. A shared exponential of a bank may have a hundred entries; its size grows
// with their number.
const terms = 8

func (t *centre) times(cols [][]Term) *spread {
	n := t.n
	s := &spread{make([]float64, len(cols)*n), make([]float64, len(cols)), make([]float64, len(cols)*n)}
	for k, col := range cols {
		move, size := s.move[k*n:k*n+n], s.size[k*n:k*n+n]
		for _, q := range col {
			for i := range move {
				v := t.c[i*n+q.At] * q.Coef
				move[i] += v
				size[i] += math.Abs(v)
			}
		}
		const more = 2 // of the coefficient, and of the size itself
		share := math.Max(1, float64(len(col)+more)/terms)
		for i := range move {
			size[i] *= share
			s.big[k] = math.Max(s.big[k], math.Abs(move[i])+size[i]*terms*eps)
		}
	}
	return s
}

// between is how column k moves the difference x[a] - x[b], and a bound of its error: of
// the roundings, and of C's defect, which reaches both unknowns.
func (s *spread) between(t *centre, k, a, b int) (value, err float64) {
	n := t.n
	size := 0.0
	if a >= 0 {
		value += s.move[k*n+a]
		size += s.size[k*n+a]
	}
	if b >= 0 {
		value -= s.move[k*n+b]
		size += s.size[k*n+b]
	}
	const roundings = 12 // of the products, their sums and the difference
	return value, roundings*eps*size + 2*t.defect/(1-t.defect)*s.big[k]
}

// regular tells whether M + Σ δ_k col_k ⊗ difference_k is regular for all |δ_k| up to the
// radii: it is where the spectral radius of |T C A| times the radii is below 1, which a
// positive vector shows that it makes smaller in every component.
func (t *centre) regular(params []param, radii []float64) bool {
	var live []int // those that are uncertain at all
	for k := range params {
		if radii[k] > 0 {
			live = append(live, k)
		}
	}
	k := len(live)
	cols := make([][]Term, k)
	for j, at := range live {
		cols[j] = params[at].col
	}
	s := t.times(cols)
	h := make([]float64, k*k)
	for i, at := range live {
		p := &params[at]
		for j, from := range live {
			v, e := s.between(t, j, p.a, p.b)
			h[i*k+j] = (math.Abs(v) + e) * radii[from]
		}
	}
	return shrinks(h, k)
}

// shrinks tells whether the spectral radius of a matrix without negative entries, k by k,
// is below 1: it is where some positive vector becomes smaller in every component. A few
// powers find one where the radius is well below 1, or that there is none; else it is
// (I - h)^-1 1, if that is positive.
func shrinks(h []float64, k int) bool {
	w, next := make([]float64, k), make([]float64, k)
	for i := range w {
		w[i] = 1
	}
	const rounds = 12
	for range rounds {
		smaller, larger, top := apply(h, w, next)
		switch {
		case smaller:
			return true
		case larger || math.IsNaN(top) || math.IsInf(top, 0):
			return false
		}
		// Drawn out to the size of 1, and kept positive. Halves of both keep a matrix
		// with a period from swinging.
		const floor = 1e-12
		for i := range w {
			w[i] = w[i]/2 + next[i]/(2*top) + floor
		}
	}
	m := make([]float64, k*k)
	for i := range m {
		m[i] = -h[i]
	}
	for i := range k {
		m[i*k+i]++
	}
	if !invert(m, k) {
		return false
	}
	for i := range k {
		w[i] = 0
		for _, v := range m[i*k : i*k+k] {
			w[i] += v
		}
		if !(w[i] > 0) {
			return false
		}
	}
	smaller, _, _ := apply(h, w, next)
	return smaller
}

// apply puts an upper bound of h w into next, and tells whether it is below w in every
// component, in none, and how large it is.
func apply(h, w, next []float64) (smaller, larger bool, top float64) {
	k := len(w)
	smaller, larger = true, true
	for i := range next {
		sum := 0.0
		for j, v := range h[i*k : i*k+k] {
			sum += v * w[j]
		}
		sum *= 1 + float64(k+4)*eps
		next[i] = sum
		smaller = smaller && sum < w[i]
		larger = larger && sum >= w[i]
		top = math.Max(top, sum)
	}
	return smaller, larger, top
}
