package follow

import "math"

// A bordered system is
//
//	[ J   b ] [ x ]   [ f ]
//	[ cᵀ  d ] [ y ] = [ g ]
//
// solved by way of J alone. J may be close to singular, as it is near a fold:
// mixed block elimination (Govaerts, section 3 of the paper named in the package
// documentation; he calls it BEM) takes a first y by the adjoint system, which
// is accurate then, and corrects it by the ordinary one. A plain block
// elimination would lose the digits that J has lost.
type bordered struct {
	p         Problem
	b, c      []float64
	d         float64
	v         []float64 // J⁻¹ b
	w         []float64 // J⁻ᵀ c
	pivot     float64   // d - cᵀ v
	adjoint   float64   // d - wᵀ b
	plain     bool      // c = 0: λ alone is given
	rhs, move []float64
}

func newBordered(p Problem) *bordered {
	n := p.Size()
	return &bordered{
		p: p, b: make([]float64, n), v: make([]float64, n), w: make([]float64, n),
		rhs: make([]float64, n), move: make([]float64, n+1),
	}
}

// prepare takes over the last linearisation of the problem. border is the last
// row, n+1 long, and not modified.
func (s *bordered) prepare(border []float64, plain bool) bool {
	n := len(s.b)
	s.c, s.d, s.plain = border[:n], border[n], plain
	s.p.DLambda(s.b)
	if plain {
		return true
	}
	copy(s.v, s.b)
	copy(s.w, s.c)
	if !s.p.Solve(s.v) || !s.p.SolveT(s.w) {
		return false
	}
	s.pivot, s.adjoint = s.d-dot(s.c, s.v), s.d-dot(s.w, s.b)
	return true
}

// solve returns the solution for the right side (sign f, g), valid until the
// next call. f nil means 0.
func (s *bordered) solve(f []float64, sign, g float64) (move []float64, ok bool) {
	n := len(s.b)
	y := g
	if s.plain && g != 0 {
		y = g / s.d
	}
	if !s.plain {
		for i, e := range f {
			y -= s.w[i] * sign * e
		}
		y /= s.adjoint
	}
	for i := range s.rhs {
		s.rhs[i] = -s.b[i] * y
		if f != nil {
			s.rhs[i] += sign * f[i]
		}
	}
	if !s.p.Solve(s.rhs) {
		return nil, false
	}
	if !s.plain {
		correction := (g - s.d*y - dot(s.c, s.rhs)) / s.pivot
		for i := range s.rhs {
			s.rhs[i] -= s.v[i] * correction
		}
		y += correction
	}
	copy(s.move, s.rhs)
	s.move[n] = y
	for _, e := range s.move {
		if !(math.Abs(e) <= math.MaxFloat64) {
			return nil, false
		}
	}
	return s.move, true
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}
