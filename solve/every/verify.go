package every

import (
	"math"

	"biaswright/solve/interval"
)

// values are the exponentials and their slopes at real unknowns.
func (s *System) values(x []float64) (u, y, dy []float64) {
	u, y, dy = make([]float64, len(s.Exps)), make([]float64, len(s.Exps)), make([]float64, len(s.Exps))
	for k := range s.Exps {
		e := &s.Exps[k]
		u[k] = e.Offset
		if e.A >= 0 {
			u[k] += x[e.A]
		}
		if e.B >= 0 {
			u[k] -= x[e.B]
		}
		at := math.Exp((u[k] - e.Offset0) / e.Phi)
		dy[k] = at / e.Phi
		y[k] = math.Expm1(u[k] / e.Phi)
		if e.Offset0 != 0 {
			y[k] = at - math.Exp(-e.Offset0/e.Phi)
		}
	}
	return u, y, dy
}

// middle is the middle of a box.
func (b *box) middle() []float64 {
	x := make([]float64, len(b.x))
	for i := range x {
		x[i] = b.x[i].Mid()
	}
	return x
}

// newton looks for a solution from x, in doubles, and stays in the box; false where it
// finds none. It looks away from solutions that it is given (deflation: K. M. Brown and
// W. B. Gearhart, Numerische Mathematik 16, 1971): there the balances, multiplied by the
// inverse squares of the distances, are no longer small.
func (s *System) newton(b *box, x []float64, params []param, away [][]float64) ([]float64, bool) {
	x = append([]float64(nil), x...)
	f := make([]float64, s.N)
	const steps = 40
	last := math.Inf(1)
	for range steps {
		u, y, dy := s.values(x)
		for i := range s.Rows {
			r := &s.Rows[i]
			f[i] = r.Const
			for _, t := range r.Lin {
				f[i] += t.Coef * x[t.At]
			}
			for _, t := range r.Exp {
				f[i] += t.Coef * y[t.At]
			}
			for _, t := range r.Prod {
				p := &s.Prods[t.At]
				f[i] += t.Coef * (y[p.F] - y[p.R]) * (1 - u[p.R]*p.Slope)
			}
		}
		c, _, ok := s.inverse(params, s.pointSlopes(u, y, dy))
		if !ok {
			return nil, false
		}
		step := make([]float64, s.N)
		for i := range step {
			for j := range f {
				step[i] -= c.c[i*s.N+j] * f[j]
			}
		}
		if f := deflated(x, step, away); f != 1 {
			for i := range step {
				step[i] *= f
			}
		}
		size := s.advance(b, x, u, step)
		const converged = 1e-13 // V; a verification has its own say
		if size < converged || size < 1e-11 && size >= last {
			return x, true
		}
		last = size
	}
	return nil, false
}

// deflated is what looking away from solutions a makes of a Newton step: the balances are
// multiplied by Π (1 + 1/|x - a|²), and by the Sherman-Morrison formula the step by 1/(1 -
// the slope of that product's logarithm along the step).
func deflated(x, step []float64, away [][]float64) float64 {
	slope := 0.0
	for _, a := range away {
		square, along := 0.0, 0.0
		for i := range x {
			square += (x[i] - a[i]) * (x[i] - a[i])
			along += (x[i] - a[i]) * step[i]
		}
		if square == 0 {
			return 1
		}
		slope -= 2 * along / (square * (1 + square)) // d/dx ln(1 + 1/r²) = -2 r/(r² (1 + r²))
	}
	const most = 10 // no step grows by more
	f := 1 / (1 - slope)
	return math.Max(-most, math.Min(most, f))
}

// advance takes a step as far as exponentials bear it and the box reaches, and returns how
// far the unknowns moved.
func (s *System) advance(b *box, x, u, step []float64) float64 {
	share := 1.0
	for k := range s.Exps {
		e := &s.Exps[k]
		rise := 0.0
		if e.A >= 0 {
			rise += step[e.A]
		}
		if e.B >= 0 {
			rise -= step[e.B]
		}
		// Upwards an exponential outruns its tangent: a few Phi at a time, once it
		// conducts.
		const few, conducting = 4, 10
		if u[k]-e.Offset0 > conducting*e.Phi && rise > few*e.Phi {
			share = math.Min(share, few*e.Phi/rise)
		}
	}
	size := 0.0
	for i := range x {
		was := x[i]
		x[i] = math.Min(math.Max(x[i]+share*step[i], b.x[i].Lo), b.x[i].Hi)
		size = math.Max(size, math.Abs(x[i]-was))
	}
	return size
}

// params are the uncertain slopes of the system: one for each exponential in the rows, and
// two for each product, by its two arguments.
func (s *System) params(c columns) []param {
	var out []param
	for k := range s.Exps {
		out = append(out, param{c.exp[k], s.Exps[k].A, s.Exps[k].B})
	}
	for t := range s.Prods {
		f, r := &s.Exps[s.Prods[t].F], &s.Exps[s.Prods[t].R]
		out = append(out, param{c.prod[t], f.A, f.B}, param{c.prod[t], r.A, r.B})
	}
	return out
}

// pointSlopes are the params' slopes at real values.
func (s *System) pointSlopes(u, y, dy []float64) []float64 {
	out := append([]float64(nil), dy...)
	for t := range s.Prods {
		p := &s.Prods[t]
		q := 1 - u[p.R]*p.Slope
		out = append(out, dy[p.F]*q, -dy[p.R]*q-(y[p.F]-y[p.R])*p.Slope)
	}
	return out
}

// slopes are the params' derivatives on a box.
func (s *System) slopes(u []interval.I) []interval.I {
	out := make([]interval.I, 0, len(s.Exps)+2*len(s.Prods))
	for k := range s.Exps {
		out = append(out, s.Exps[k].slope(u[k]))
	}
	for t := range s.Prods {
		p := &s.Prods[t]
		q := interval.Of(1).Sub(u[p.R].Scale(p.Slope))
		transport := s.Exps[p.F].of(u[p.F]).Sub(s.Exps[p.R].of(u[p.R]))
		out = append(out, out[p.F].Mul(q), out[p.R].Mul(q).Add(transport.Scale(p.Slope)).Neg())
	}
	return out
}

// middles are the slopes' middles and radii, which cover them.
func middles(slopes []interval.I) (mid, rad []float64, ok bool) {
	mid, rad = make([]float64, len(slopes)), make([]float64, len(slopes))
	for k, v := range slopes {
		mid[k] = v.Mid()
		rad[k] = interval.Up(math.Max(v.Hi-mid[k], mid[k]-v.Lo))
		if math.IsNaN(rad[k]) || math.IsInf(rad[k], 0) || math.IsInf(mid[k], 0) {
			return nil, nil, false
		}
	}
	return mid, rad, true
}

// shared gives params, and their slopes between a known point and every point of a box, in
// which a product's second factor, q, stands at its middle with the exponentials that it
// multiplies: one uncertain slope for all that an exponential does. What q adds beside its
// middle is small and stands apart.
func (s *System) shared(u []interval.I, c columns, known *Point) ([]param, []interval.I) {
	size := len(s.Exps) + 2*len(s.Prods)
	params, slopes := make([]param, 0, size), make([]interval.I, 0, size)
	for k := range s.Exps {
		params = append(params, param{c.exp[k], s.Exps[k].A, s.Exps[k].B})
		slopes = append(slopes, s.Exps[k].chord(known.u[k], u[k]))
	}
	for t := range s.Prods {
		p := &s.Prods[t]
		q := interval.Of(1).Sub(u[p.R].Scale(p.Slope))
		middle := q.Mid()
		rest := q.Sub(interval.Of(middle))
		f, r := &params[p.F], &params[p.R]
		f.col, r.col = append([]Term(nil), f.col...), append([]Term(nil), r.col...)
		for _, b := range c.prod[t] {
			f.col = append(f.col, Term{b.At, b.Coef * middle})
			r.col = append(r.col, Term{b.At, -b.Coef * middle})
		}
		transport := known.y[p.F].Sub(known.y[p.R]).Scale(p.Slope)
		params = append(params, param{c.prod[t], f.a, f.b}, param{c.prod[t], r.a, r.b})
		slopes = append(slopes, slopes[p.F].Mul(rest), slopes[p.R].Mul(rest).Add(transport).Neg())
	}
	return params, slopes
}

// alone tells whether no second solution lies in a box, besides the known one wherever that
// is.
func (s *System) alone(u []interval.I, c columns, known *Point) bool {
	params, slopes := s.shared(u, c, known)
	mid, rad, ok := middles(slopes)
	if !ok {
		return false
	}
	at, ok := s.newCentre(params, mid)
	return ok && at.regular(params, rad)
}

// A Point is a solution: each unknown lies in X, and no other solution has all of them
// there.
type Point struct {
	X    []interval.I
	only []interval.I // a box about X in which there is no other solution
	u, y []interval.I
}

// Coordinates are the unknowns and then the exponentials' arguments, as intervals.
func (p *Point) Coordinates() []interval.I {
	return append(append([]interval.I(nil), p.X...), p.u...)
}

// verify proves that one solution, and only one, lies near x (W. Krawczyk, Computing 4,
// 1969): the image of a small box under x - C F(x) + (I - C J)(X - x) lies inside it.
func (s *System) verify(x []float64, params []param, slack float64) *Point {
	n := s.N
	tight := make([]interval.I, n)
	for i := range tight {
		tight[i] = interval.Of(x[i])
	}
	f := s.Residual(tight)
	if slack > 0 {
		s.loosen(f, tight, slack)
	}
	u, y, dy := s.values(x)
	c, ok := s.newCentre(params, s.pointSlopes(u, y, dy))
	if !ok {
		return nil
	}
	shift, radius := make([]float64, n), make([]float64, n) // |C F(x)|, and the box's
	for i := range n {
		sum := interval.Of(0)
		for j := range n {
			sum = sum.Add(f[j].Scale(c.c[i*n+j]))
		}
		shift[i] = sum.Mag()
		radius[i] = 2*shift[i] + 4*eps*math.Abs(x[i]) + math.SmallestNonzeroFloat64
	}
	const tries = 30
	for range tries {
		image, ok := s.image(x, radius, shift, c, params, slack)
		if !ok {
			return nil
		}
		inside := true
		for i := range n {
			inside = inside && image[i] < radius[i]
		}
		if inside {
			return s.pointAt(x, image, radius)
		}
		for i := range n {
			radius[i] = 1.5*math.Max(radius[i], image[i]) + eps*math.Abs(x[i])
		}
	}
	return nil
}

// image bounds how far from x the image of the box x ± radius reaches, with every
// coefficient off by as much as a share slack.
func (s *System) image(x, radius, shift []float64, c *centre, params []param, slack float64) ([]float64, bool) {
	n := s.N
	around := make([]interval.I, n)
	for i := range around {
		around[i] = interval.I{Lo: interval.Down(x[i] - radius[i]), Hi: interval.Up(x[i] + radius[i])}
	}
	u := make([]interval.I, len(s.Exps))
	for k := range s.Exps {
		u[k] = difference(around, s.Exps[k].A, s.Exps[k].B, s.Exps[k].Offset)
	}
	slopes := s.slopes(u)
	mid := s.pointSlopes(s.values(x))
	cols := make([][]Term, len(params))
	rad := make([]float64, len(params))
	for k := range params {
		cols[k] = params[k].col
		rad[k] = interval.Up(math.Max(slopes[k].Hi-mid[k], mid[k]-slopes[k].Lo)) + 2*s.looseness(k, slack)*slopes[k].Mag()
		if math.IsNaN(rad[k]) || math.IsInf(rad[k], 0) {
			return nil, false
		}
	}
	moved := c.times(cols)
	widest := 0.0
	for i := range radius {
		widest = math.Max(widest, interval.Up(around[i].Hi-x[i]))
	}
	out := make([]float64, n)
	for i := range n {
		sum := shift[i] + (c.defect+2*slack*c.size)*widest
		for k := range params {
			d := 0.0 // how far the difference may be from its middle
			if a := params[k].a; a >= 0 {
				d += radius[a]
			}
			if b := params[k].b; b >= 0 {
				d += radius[b]
			}
			const roundings = 8
			m := math.Abs(moved.move[k*n+i]) + roundings*eps*moved.size[k*n+i]
			sum += m * rad[k] * d
		}
		out[i] = sum * (1 + float64(4*len(params)+n+16)*eps)
	}
	return out, true
}

// pointAt is the enclosure x ± image, in which the solution lies, its uniqueness proved in
// x ± radius.
func (s *System) pointAt(x, image, radius []float64) *Point {
	p := &Point{X: make([]interval.I, s.N), only: make([]interval.I, s.N), u: make([]interval.I, len(s.Exps)), y: make([]interval.I, len(s.Exps))}
	for i := range p.X {
		r := math.Min(image[i], radius[i])
		p.X[i] = interval.I{Lo: interval.Down(x[i] - r), Hi: interval.Up(x[i] + r)}
		// Rounded inward: the proof is of x ± radius.
		p.only[i] = interval.I{Lo: interval.Up(x[i] - radius[i]), Hi: interval.Down(x[i] + radius[i])}
	}
	for k := range s.Exps {
		e := &s.Exps[k]
		p.u[k] = difference(p.X, e.A, e.B, e.Offset)
		p.y[k] = e.of(p.u[k])
	}
	return p
}

// looseness is the share by which the slope of param k may be off where coefficients are by
// slack: of an exponential also what its offsets, as doubles, are off by, over its Phi.
func (s *System) looseness(k int, slack float64) float64 {
	if slack == 0 {
		return 0
	}
	if k < len(s.Exps) {
		return slack + s.Exps[k].unsure()
	}
	p := &s.Prods[(k-len(s.Exps))/2] // two params each
	return slack + s.Exps[p.F].unsure() + s.Exps[p.R].unsure()
}

// unsure is the share by which the exponential may be off since its offsets are sums of a
// few decimals, each rounded.
func (e *Exponential) unsure() float64 {
	const roundings = 4
	return roundings * eps * (math.Abs(e.Offset) + math.Abs(e.Offset0)) / e.Phi
}

// loosen widens a residual by a share of each of its terms, so that a verification holds
// for coefficients that are off by as much.
func (s *System) loosen(f, x []interval.I, slack float64) {
	u, y := make([]interval.I, len(s.Exps)), make([]interval.I, len(s.Exps))
	for k := range s.Exps {
		e := &s.Exps[k]
		u[k] = difference(x, e.A, e.B, e.Offset)
		y[k] = e.of(u[k])
	}
	for i := range s.Rows {
		r := &s.Rows[i]
		size := math.Abs(r.Const)
		for _, t := range r.Lin {
			size += x[t.At].Scale(t.Coef).Mag()
		}
		w := 0.0
		// An exponential itself, y + 1, is off by a share, not y.
		for _, t := range r.Exp {
			w += s.looseness(t.At, slack) * math.Abs(t.Coef) * (y[t.At].Mag() + 1)
		}
		for _, t := range r.Prod {
			p := &s.Prods[t.At]
			q := interval.Of(1).Sub(u[p.R].Scale(p.Slope))
			w += s.looseness(len(s.Exps)+2*t.At, slack) * math.Abs(t.Coef) * (y[p.F].Mag() + y[p.R].Mag() + 2) * q.Mag()
		}
		w = interval.Up(w + slack*size)
		f[i] = interval.I{Lo: interval.Down(f[i].Lo - w), Hi: interval.Up(f[i].Hi + w)}
	}
}

// Verify proves that the system has a solution near x, and only one in a small box about
// it, with each coefficient off by as much as a share slack; nil where it does not.
func Verify(s *System, x []float64, slack float64) *Point {
	return s.verify(x, s.params(s.columns()), slack)
}
