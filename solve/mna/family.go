package mna

// A Family is the balances of a circuit as a function of one more number:
// F(x, lambda) = 0, which package follow follows. Lambda is a factor of the ramp,
// with 1 the real circuit, or the number of one or several slots.
//
// A Family uses its system; between its own calls the system must be left alone.
type Family struct {
	s     *System
	scale []float64
	move  func(lambda float64) bool // puts lambda in force
	slope func()                    // adds dF/dlambda of the last evaluation to s.f
	at    float64
	valid bool
}

// step is the relative half width of a central difference in lambda, near the
// cube root of the rounding unit, where its error is least.
const step = 6e-6

// Sources is the family in the factor of all rails, cells, drops and current
// sources: at 0 the circuit is dead.
func (s *System) Sources() *Family {
	f := s.family()
	f.move = func(lambda float64) bool {
		s.SetRamp(Ramp{Source: lambda, Gain: 1})
		return true
	}
	f.slope = func() {
		s.along(s.full)
		for i := range s.sources {
			c := &s.sources[i]
			s.f[c.ra] += c.amps
			s.f[c.rb] -= c.amps
		}
	}
	return f
}

// Gains is the family in the factor of the transistors' gains: at 0 every
// transistor is two junctions that do not know of each other, and the circuit has
// one point.
func (s *System) Gains() *Family {
	f := s.family()
	f.move = func(lambda float64) bool {
		s.SetRamp(Ramp{Source: 1, Gain: lambda})
		return true
	}
	f.slope = func() {
		for i := range s.bipolars {
			b := &s.bipolars[i]
			pt := b.pt
			b.k.AtGain(b.ube, b.ubc, s.ramp.Gain, &pt)
			s.f[b.rc] += b.sign * pt.IcGain
			s.f[b.rb] += b.sign * pt.IbGain
			s.f[b.re] -= b.sign * (pt.IcGain + pt.IbGain)
		}
	}
	return f
}

// Numbers is the family in the number of the tuner's slots, all alike. Width is
// a change of it that matters, in the slots' unit, for differences.
func (s *System) Numbers(t *Tuner, width float64) *Family {
	f := s.family()
	numbers := make([]float64, len(t.slots))
	f.move = func(lambda float64) bool {
		for i := range numbers {
			numbers[i] = lambda
		}
		return t.Set(numbers...)
	}
	if t.offsets && len(t.devices) == 0 && !t.follow {
		f.slope = func() { s.along(t.direction()) }
		return f
	}
	below := make([]float64, s.n+1)
	f.slope = func() {
		h := step * width
		x := append([]float64(nil), s.x[:s.n]...)
		if !f.move(f.at-h) || !s.evaluate(x) {
			return
		}
		copy(below, s.f)
		f.move(f.at + h)
		s.evaluate(x)
		for i := range s.f {
			s.f[i] = (s.f[i] - below[i]) / (2 * h)
		}
		f.move(f.at)
	}
	return f
}

// direction is each node's shift for a unit change of the slots.
func (t *Tuner) direction() []float64 {
	d := make([]float64, t.s.nodes)
	for _, b := range t.s.forest.branches {
		d[b.child] = d[b.parent]
		for _, id := range t.slots {
			if b.slot == id {
				d[b.child] += b.rise
			}
		}
	}
	return d
}

func (s *System) family() *Family {
	f := &Family{s: s, scale: make([]float64, s.n)}
	for i := range f.scale {
		f.scale[i] = 1 // V: junction voltages, on which all turns, are of this size
	}
	return f
}

// along adds what a shift of the nodes, with the unknowns held, does to the
// balances.
func (s *System) along(v []float64) {
	for i := range s.resistors {
		r := &s.resistors[i]
		d := r.g * (v[r.a] - v[r.b])
		s.f[r.ra] += d
		s.f[r.rb] -= d
	}
	for i := range s.junctions {
		j := &s.junctions[i]
		d := j.g * (v[j.a] - v[j.k])
		s.f[j.ra] += d
		s.f[j.rk] -= d
	}
	for i := range s.bipolars {
		b := &s.bipolars[i]
		de, dc := b.sign*(v[b.b]-v[b.e]), b.sign*(v[b.b]-v[b.c])
		ic := b.sign * (b.pt.IcVbe*de + b.pt.IcVbc*dc)
		ib := b.sign * (b.pt.IbVbe*de + b.pt.IbVbc*dc)
		s.f[b.rc] += ic
		s.f[b.rb] += ib
		s.f[b.re] -= ic + ib
	}
}

// evaluate is currents with a word on whether F came out finite.
func (s *System) evaluate(x []float64) bool {
	s.currents(x)
	return finite(s.f)
}

// Size is the number of unknowns.
func (f *Family) Size() int { return f.s.n }

// XScale is the scale of each unknown in V; read only.
func (f *Family) XScale() []float64 { return f.scale }

// Linearise evaluates F, its Jacobian's factors and tolerances at (x, lambda),
// without guards; false where that is not possible.
func (f *Family) Linearise(x []float64, lambda float64) bool {
	if !f.valid || f.at != lambda {
		f.at = lambda
		if f.valid = f.move(lambda); !f.valid {
			return false
		}
	}
	if !f.s.evaluate(x) {
		return false
	}
	f.s.tolerances()
	return f.s.factor()
}

// Residual is F and its tolerances in A, of the last Linearise; read only.
func (f *Family) Residual() (balance, tol []float64) { return f.s.f[:f.s.n], f.s.tol[:f.s.n] }

// DLambda writes dF/dlambda of the last Linearise, in A per unit of lambda.
func (f *Family) DLambda(dst []float64) {
	s := f.s
	held := append([]float64(nil), s.f...)
	clear(s.f)
	f.slope()
	copy(dst, s.f[:s.n])
	copy(s.f, held)
}

// Solve solves J b = b in place with the Jacobian of the last Linearise; false
// where the solution is not finite.
func (f *Family) Solve(b []float64) bool {
	f.s.active.Solve(b)
	return finite(b)
}

// SolveT is Solve with the transpose.
func (f *Family) SolveT(b []float64) bool {
	f.s.active.SolveT(b)
	return finite(b)
}

// DetSign is the sign of the Jacobian's determinant of the last Linearise.
func (f *Family) DetSign() int { return f.s.active.DetSign() }
