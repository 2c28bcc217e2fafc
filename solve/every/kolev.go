package every

import (
	"math"

	"biaswright/solve/interval"
)

// A linearised box: each exponential is a chord and a remainder, so that the balances are
// linear in the unknowns with a few intervals for what the chords leave out. Their one real
// inverse narrows all unknowns and arguments at once.
type linearised struct {
	c         *centre
	moved     *spread
	cols      [][]Term     // of the remainders: exponentials, then products
	remainder []interval.I // what each leaves out
	constant  []interval.I // by row: what is known
}

// linearise makes the chords of a box; false where its matrix is worth nothing.
func (s *System) linearise(b *box, c columns) (*linearised, bool) {
	k := len(s.Exps)
	l := &linearised{cols: make([][]Term, k, k+len(s.Prods)), remainder: make([]interval.I, k, k+len(s.Prods)), constant: make([]interval.I, s.N)}
	y := make([]interval.I, k)
	chords := make([]float64, k)
	for i := range s.Exps {
		y[i] = s.Exps[i].of(b.u[i])
		chords[i], l.remainder[i] = s.Exps[i].chordOn(b.u[i])
		l.cols[i] = append([]Term(nil), c.exp[i]...)
	}
	for i := range s.Rows {
		l.constant[i] = interval.Of(s.Rows[i].Const)
	}
	var params []param
	var slopes []float64
	for t := range s.Prods {
		p := &s.Prods[t]
		// W = Qc P + Pc Q - Pc Qc + (P - Pc)(Q - Qc); P are the exponentials' difference.
		transport := y[p.F].Sub(y[p.R])
		q := interval.Of(1).Sub(b.u[p.R].Scale(p.Slope))
		pc, qc := transport.Mid(), q.Mid()
		if math.IsInf(pc, 0) || math.IsInf(qc, 0) {
			return nil, false
		}
		for _, term := range c.prod[t] {
			l.cols[p.F] = append(l.cols[p.F], Term{term.At, term.Coef * qc})
			l.cols[p.R] = append(l.cols[p.R], Term{term.At, -term.Coef * qc})
		}
		f := &s.Exps[p.R]
		params, slopes = append(params, param{c.prod[t], f.A, f.B}), append(slopes, -pc*p.Slope)
		bent := transport.Sub(interval.Of(pc)).Mul(q.Sub(interval.Of(qc)))
		// Pc Q - Pc Qc = Pc (1 - Qc) - Pc Slope u, u = x[A] - x[B] + Offset.
		fixed := interval.Of(1).Sub(interval.Of(qc)).Sub(interval.Of(f.Offset).Scale(p.Slope)).Scale(pc)
		l.cols = append(l.cols, c.prod[t])
		l.remainder = append(l.remainder, bent.Add(fixed))
	}
	for i := range s.Exps {
		e := &s.Exps[i]
		params, slopes = append(params, param{l.cols[i], e.A, e.B}), append(slopes, chords[i])
		l.remainder[i] = l.remainder[i].Add(interval.Of(e.Offset).Scale(chords[i]))
	}
	var ok bool
	if l.c, ok = s.newCentre(params, slopes); !ok {
		return nil, false
	}
	l.moved = l.c.times(l.cols)
	return l, true
}

// chordOn is a chord of the exponential over an interval, and all that y - chord u may be
// there.
func (e *Exponential) chordOn(u interval.I) (float64, interval.I) {
	slope := e.chordAt(u.Lo, u.Hi).Mid()
	if math.IsInf(u.Lo, 0) || math.IsInf(u.Hi, 0) || math.IsInf(slope, 0) || math.IsNaN(slope) {
		return 0, e.of(u)
	}
	over := func(at float64) interval.I { // y - slope u at one place
		return e.of(interval.Of(at)).Sub(interval.Of(at).Scale(slope))
	}
	a, b := over(u.Lo), over(u.Hi)
	// It is convex: nowhere above its ends, nowhere below a tangent of its own.
	at := e.flat(slope, u)
	low, tilt := over(at), e.slope(interval.Of(at)).Sub(interval.Of(slope))
	reach := interval.I{Lo: u.Lo - at, Hi: u.Hi - at}
	reach = interval.I{Lo: interval.Down(reach.Lo), Hi: interval.Up(reach.Hi)}
	return slope, interval.I{Lo: low.Add(tilt.Mul(reach)).Lo, Hi: math.Max(a.Hi, b.Hi)}
}

// flat is where the exponential has a slope, about, and inside an interval.
func (e *Exponential) flat(slope float64, u interval.I) float64 {
	at := e.Offset0 + e.Phi*math.Log(slope*e.Phi)
	if math.IsNaN(at) {
		at = u.Mid()
	}
	return math.Min(math.Max(at, u.Lo), u.Hi)
}

// narrow narrows the box by the linearised balances; false if it is empty. moved tells that
// something became narrower by more than a tenth.
func (l *linearised) narrow(s *System, b *box) (alive, moved bool) {
	n, k := s.N, len(l.cols)
	// x = -C (constant + Σ remainder col) + (I - C M) x
	far := 0.0
	for i := range b.x {
		far = math.Max(far, b.x[i].Mag())
	}
	base := make([]interval.I, n)
	for i := range base {
		sum := interval.Of(0)
		for j := range n {
			sum = sum.Add(l.constant[j].Scale(l.c.c[i*n+j]))
		}
		base[i] = sum.Neg()
	}
	drift := interval.Up(l.c.defect * far)
	const enough = 0.98
	meet := func(old *interval.I, with interval.I) bool {
		m := old.Meet(with)
		if math.IsNaN(m.Lo) || math.IsNaN(m.Hi) { // no claim at all
			return true
		}
		if m.Empty() {
			return false
		}
		moved = moved || !(m.Width() >= enough*old.Width())
		*old = m
		return true
	}
	for i := range b.x {
		if !meet(&b.x[i], l.sum(base[i], drift, func(j int) (float64, float64) {
			const roundings = 8
			return l.moved.move[j*n+i], roundings * eps * l.moved.size[j*n+i]
		}, k)) {
			return false, true
		}
	}
	for i := range s.Exps {
		e := &s.Exps[i]
		at := interval.Of(e.Offset)
		if e.A >= 0 {
			at = at.Add(base[e.A])
		}
		if e.B >= 0 {
			at = at.Sub(base[e.B])
		}
		if !meet(&b.u[i], l.sum(at, 2*drift, func(j int) (float64, float64) { return l.plain(j, e.A, e.B) }, k)) {
			return false, true
		}
	}
	return true, moved
}

// plain is how remainder j moves a difference, with the roundings alone: the defect acts
// on the unknowns as they are, and is in the drift.
func (l *linearised) plain(j, a, b int) (value, err float64) {
	n := l.c.n
	size := 0.0
	if a >= 0 {
		value += l.moved.move[j*n+a]
		size += l.moved.size[j*n+a]
	}
	if b >= 0 {
		value -= l.moved.move[j*n+b]
		size += l.moved.size[j*n+b]
	}
	const roundings = 12
	return value, roundings * eps * size
}

// sum is base - Σ remainder_j (weight_j ± error_j) ± drift.
func (l *linearised) sum(base interval.I, drift float64, weight func(j int) (value, err float64), k int) interval.I {
	out := base
	for j := range k {
		v, e := weight(j)
		if v == 0 && e == 0 {
			continue
		}
		out = out.Sub(l.remainder[j].Mul(interval.I{Lo: interval.Down(v - e), Hi: interval.Up(v + e)}))
	}
	return interval.I{Lo: interval.Down(out.Lo - drift), Hi: interval.Up(out.Hi + drift)}
}

// influence is how far the remainder of an exponential moves any unknown, at most.
func (l *linearised) influence(k int) float64 {
	return l.moved.big[k] * l.remainder[k].Width()
}
