package mna

import (
	"math"

	"biaswright/netlist"
)

// A Ramp deforms the balances for a strategy that leads a simpler circuit over
// into the real one. The real circuit is Full.
type Ramp struct {
	// Source multiplies every rail, cell, drop and current source.
	Source float64
	// Gain multiplies every transistor's gains; at 0 a transistor is two
	// junctions that do not know of each other.
	Gain float64
	// Shunt is a conductance in S from every free node to its anchor: gnd,
	// unless Anchor sets others.
	Shunt float64
}

// Full is the circuit as it is.
var Full = Ramp{Source: 1, Gain: 1}

// SetRamp puts a deformation in force.
func (s *System) SetRamp(r Ramp) {
	s.ramp = r
	for i, v := range s.full {
		s.offset[i] = v * r.Source
	}
	s.setBase()
	s.near = false
}

// Anchor ties the ramp's shunts to these unknowns instead of gnd, until Release.
func (s *System) Anchor(x []float64) { copy(s.anchor, x) }

// AnchorNodes leaves only the shunts of these nodes, tied to their voltages in V,
// until Release.
func (s *System) AnchorNodes(volts map[netlist.NodeID]float64) {
	clear(s.tied)
	for node, v := range volts {
		s.Place(s.anchor, node, v)
		if r := int(s.row[node]); r < s.n {
			s.tied[r] = 1
		}
	}
}

// Release ties the ramp's shunts to gnd again, at every free node.
func (s *System) Release() {
	clear(s.anchor)
	for i := range s.tied {
		s.tied[i] = 1
	}
}

// setBase computes the constant part of the Jacobian and the sources' currents.
func (s *System) setBase() {
	for i := range s.base {
		s.base[i] = 0
	}
	for i := range s.resistors {
		r := &s.resistors[i]
		s.base[r.p[0]] += r.g
		s.base[r.p[1]] -= r.g
		s.base[r.p[2]] -= r.g
		s.base[r.p[3]] += r.g
	}
	if s.ramp.Shunt != 0 {
		for i, at := range s.diagonal {
			s.base[at] += s.ramp.Shunt * s.tied[i]
		}
	}
	for i := range s.sources {
		s.sources[i].i = s.sources[i].amps * s.ramp.Source
	}
}

// Restart makes the next Linearise start every junction at its start voltage, a
// cold start: forward junctions and base-emitter junctions conducting, reversed
// zeners in breakdown, collectors out of saturation.
func (s *System) Restart() { s.fresh, s.near = true, false }

// From makes the next Linearise take its junction voltages from x.
func (s *System) From(x []float64) {
	s.fresh, s.near = false, false
	s.place(x)
	for i := range s.junctions {
		j := &s.junctions[i]
		j.u = (s.v[j.a] - s.v[j.k]) * j.share
	}
	for i := range s.bipolars {
		b := &s.bipolars[i]
		b.ube = b.sign * (s.v[b.b] - s.v[b.e])
		b.ubc = b.sign * (s.v[b.b] - s.v[b.c])
	}
}

// Continue makes the next Linearise guard its junctions against where the last
// evaluation left them: for a start next to the last solution, which From would
// only confirm.
func (s *System) Continue() { s.fresh, s.near = false, false }

// place computes the node voltages from the unknowns.
func (s *System) place(x []float64) {
	known := s.x
	copy(known, x)
	v, offset := s.v[:len(s.row)], s.offset[:len(s.row)]
	for i, r := range s.row {
		v[i] = known[r] + offset[i]
	}
}

// Linearise evaluates every balance (the sum of the currents that leave a node)
// and its derivatives at x. Junctions that would rise or break down by more than
// the exponential can be trusted for are linearised at a guarded voltage instead.
func (s *System) Linearise(x []float64) bool {
	s.place(x)
	fresh := s.fresh
	s.fresh = false
	v, f, jac := s.v, s.f, s.jac
	copy(jac, s.base)
	for i := range f {
		f[i] = 0
	}
	if g := s.ramp.Shunt; g != 0 {
		for i := 0; i < s.n; i++ {
			f[i] = g * s.tied[i] * (x[i] - s.anchor[i])
		}
	}
	for i := range s.resistors {
		r := &s.resistors[i]
		r.i = r.g * (v[r.a] - v[r.b])
		f[r.ra] += r.i
		f[r.rb] -= r.i
	}
	for i := range s.sources {
		c := &s.sources[i]
		f[c.ra] += c.i
		f[c.rb] -= c.i
	}
	exact := !fresh
	for i := range s.junctions {
		j := &s.junctions[i]
		u := (v[j.a] - v[j.k]) * j.share
		at := u
		switch {
		case fresh:
			at = j.start
		case u > j.corner || u < j.knee:
			at = j.guard(u)
		}
		j.u = at
		j.i, j.g = j.d.At(at)
		current := j.i
		if at != u {
			exact = false
			current += j.g * (u - at)
		}
		j.g *= j.share
		f[j.ra] += current
		f[j.rk] -= current
		jac[j.p[0]] += j.g
		jac[j.p[1]] -= j.g
		jac[j.p[2]] -= j.g
		jac[j.p[3]] += j.g
	}
	for i := range s.bipolars {
		b := &s.bipolars[i]
		if !s.bipolar(b, fresh) {
			exact = false
		}
	}
	return exact
}

// bipolar adds one transistor to the balances and the Jacobian.
func (s *System) bipolar(b *bipolar, fresh bool) (exact bool) {
	v, f, jac := s.v, s.f, s.jac
	ube := b.sign * (v[b.b] - v[b.e])
	ubc := b.sign * (v[b.b] - v[b.c])
	atE, atC := ube, ubc
	switch {
	case fresh: // cold start: on, at the edge of saturation
		atE, atC = b.corner, 0
	case ube > b.corner || ubc > b.reach:
		atE = guard(ube, b.ube, b.corner, b.k.InvNVt)
		atC = guard(ubc, b.ubc, b.cornerC, b.k.InvNVt)
		if atC >= b.va { // beyond it the Early factor changes sign; never a solution
			atC = (b.ubc + b.va) / 2
		}
	}
	b.ube, b.ubc = atE, atC
	p := &b.pt
	if s.ramp.Gain == 1 {
		b.k.At(atE, atC, p)
	} else {
		b.k.AtGain(atE, atC, s.ramp.Gain, p)
	}
	ic, ib := p.Ic, p.Ib
	exact = atE == ube && atC == ubc
	if !exact {
		de, dc := ube-atE, ubc-atC
		ic += p.IcVbe*de + p.IcVbc*dc
		ib += p.IbVbe*de + p.IbVbc*dc
	}
	f[b.rc] += b.sign * ic
	f[b.rb] += b.sign * ib
	f[b.re] -= b.sign * (ic + ib)
	cb, cc, ce := p.IcVbe+p.IcVbc, -p.IcVbc, -p.IcVbe
	bb, bc, be := p.IbVbe+p.IbVbc, -p.IbVbc, -p.IbVbe
	jac[b.p[0]] += cc
	jac[b.p[1]] += cb
	jac[b.p[2]] += ce
	jac[b.p[3]] += bc
	jac[b.p[4]] += bb
	jac[b.p[5]] += be
	jac[b.p[6]] -= cc + bc
	jac[b.p[7]] -= cb + bb
	jac[b.p[8]] -= ce + be
	return exact
}

// guard tames a rise of a junction from last to u. Above corner the linear
// model's current is believed instead of its voltage: the exponential through
// the point reaches that current at base + n V_T ln(1 + (u - base)/(n V_T)).
// Falls, and rises of less than n V_T, are within what Newton's method brings
// home by itself, because the exponential is convex.
func guard(u, last, corner, invNVt float64) float64 {
	if u <= corner {
		return u
	}
	base := math.Max(last, corner)
	rise := (u - base) * invNVt
	if rise <= 1 {
		return u
	}
	return base + math.Log1p(rise)/invNVt
}

// guard tames both directions of a junction: breakdown is a rise seen from the
// other side.
func (j *junction) guard(u float64) float64 {
	if u < j.knee {
		return -guard(-u, -j.u, -j.knee, j.d.InvNzVt)
	}
	return guard(u, j.u, j.corner, j.d.InvNVt)
}

// factor factorises the last Jacobian, in the planned order if that will do.
func (s *System) factor() bool {
	jac := s.jac[:len(s.jac)-1]
	s.active = s.factors
	if s.factors.Factor(jac) {
		return true
	}
	s.Fallbacks++
	if s.robust == nil {
		s.robust = s.plan.NewPivoting()
	}
	s.active = s.robust
	return s.robust.Factor(jac)
}

// chordStep is the voltage step in V below which the next step may use the
// factors at hand (a chord): junctions change by exp(step/V_T), so that the error
// still shrinks ten thousandfold, and a factorisation is saved.
const chordStep = 1e-6

// Step solves J dx = -F. Near a solution it reuses the factors of the step before.
func (s *System) Step(dx []float64) bool {
	if !s.near && !s.factor() {
		return false
	}
	ok := s.descend(dx)
	s.near = true
	for _, d := range dx {
		if !(math.Abs(d) < chordStep) {
			s.near = false
			break
		}
	}
	return ok
}

// descend solves with the factors at hand.
func (s *System) descend(dx []float64) bool {
	for i := range dx {
		dx[i] = -s.f[i]
	}
	s.active.Solve(dx)
	return finite(dx)
}

// Correct evaluates F at x and solves with the factors of the last Step.
func (s *System) Correct(x, dx []float64) bool {
	s.currents(x)
	return s.descend(dx)
}

// currents evaluates F at x itself, leaving the factors alone.
func (s *System) currents(x []float64) {
	s.From(x)
	s.Linearise(x)
}

func finite(v []float64) bool {
	for _, e := range v {
		if e-e != 0 { // infinite or NaN
			return false
		}
	}
	return true
}

// The stopping rule's shares: a balance holds within a part of the largest
// current at its node, plus its own rounding.
const (
	balanceShare  = 1e-12
	roundingShare = 8 * 0x1p-52 // eps is 2^-52
)

// Balanced reports whether every balance of the last Linearise holds.
func (s *System) Balanced() bool {
	if s.balancedByShare() {
		return true
	}
	s.tolerances()
	for i, f := range s.f[:s.n] {
		if !(math.Abs(f) <= s.tol[i]) {
			return false
		}
	}
	return true
}

// balancedByShare is the first part of the rule alone, which is quick to compute
// and mostly suffices.
func (s *System) balancedByShare() bool {
	top := s.top
	clear(top)
	larger := func(row int32, current float64) {
		if a := math.Abs(current); a > top[row] {
			top[row] = a
		}
	}
	for i := range s.resistors {
		r := &s.resistors[i]
		larger(r.ra, r.i)
		larger(r.rb, r.i)
	}
	for i := range s.sources {
		c := &s.sources[i]
		larger(c.ra, c.i)
		larger(c.rb, c.i)
	}
	for i := range s.junctions {
		j := &s.junctions[i]
		larger(j.ra, j.i)
		larger(j.rk, j.i)
	}
	for i := range s.bipolars {
		b := &s.bipolars[i]
		larger(b.rc, b.pt.Ic)
		larger(b.rb, b.pt.Ib)
		larger(b.re, b.pt.Ic+b.pt.Ib)
	}
	for i, f := range s.f[:s.n] {
		if !(math.Abs(f) <= balanceShare*top[i]) {
			return false
		}
	}
	return true
}

// tolerances computes each balance's tolerance at the last evaluation.
func (s *System) tolerances() {
	v, tol, top := s.v, s.tol, s.top
	for i := range tol {
		tol[i], top[i] = 0, 0
	}
	add := func(row int32, current, rounding float64) {
		if a := math.Abs(current); a > top[row] {
			top[row] = a
		}
		tol[row] += rounding
	}
	for i := range s.resistors {
		r := &s.resistors[i]
		rounding := r.g * (math.Abs(v[r.a]) + math.Abs(v[r.b]))
		add(r.ra, r.i, rounding)
		add(r.rb, r.i, rounding)
	}
	for i := range s.sources {
		c := &s.sources[i]
		add(c.ra, c.i, 0)
		add(c.rb, c.i, 0)
	}
	for i := range s.junctions {
		j := &s.junctions[i]
		rounding := j.g * (math.Abs(v[j.a]) + math.Abs(v[j.k]))
		add(j.ra, j.i, rounding)
		add(j.rk, j.i, rounding)
	}
	for i := range s.bipolars {
		b := &s.bipolars[i]
		p := &b.pt
		vc, vb, ve := math.Abs(v[b.c]), math.Abs(v[b.b]), math.Abs(v[b.e])
		be, bc := vb+ve, vb+vc
		rc := math.Abs(p.IcVbe)*be + math.Abs(p.IcVbc)*bc
		rb := math.Abs(p.IbVbe)*be + math.Abs(p.IbVbc)*bc
		add(b.rc, p.Ic, rc)
		add(b.rb, p.Ib, rb)
		add(b.re, p.Ic+p.Ib, rc+rb)
	}
	for i := range tol {
		tol[i] = balanceShare*top[i] + roundingShare*tol[i]
	}
}
