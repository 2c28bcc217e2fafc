package solve

import (
	"math"

	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// settling leaves each point that cannot be stable, to both sides, as the circuit
// itself would: every node is tied to where it just was, and the tie loosens as
// the nodes come to rest. These are implicit Euler steps of a circuit with one
// capacitance at every node (pseudo-transient continuation: C. T. Kelley and D. E.
// Keyes, SIAM J. Numer. Anal. 35, 1998). A symmetric latch needs it: every other
// way keeps the symmetry, and with it the middle point.
func (l *ladder) settling() (steps int, ended string) {
	ended = "found no point to leave"
	for _, p := range append([]*Point(nil), l.found...) {
		if !p.Unstable {
			continue
		}
		away := l.unstableDirection(p.x)
		for _, side := range []float64{1, -1} {
			const push = 0.05 // V: a few thermal voltages leave the linear region
			x := append([]float64(nil), p.x...)
			for i := range x {
				x[i] += side * push * away[i]
			}
			taken := l.settle(x)
			steps += taken
			l.s.From(x)
			steps, ended = l.land(x, steps, newton.Options{})
		}
	}
	return steps, ended
}

// unstableDirection is the direction, of largest entry 1, in which the balances
// push away from x: inverse iteration on the Jacobian finds its eigenvector of
// least modulus, which at an unstable point of a bias network is the negative one.
func (l *ladder) unstableDirection(x []float64) []float64 {
	f := l.s.Sources()
	v := l.zero()
	for i := range v {
		v[i] = 1 + float64(i%3) // no symmetry
	}
	if !f.Linearise(x, 1) {
		return v
	}
	const rounds = 20 // each shrinks the others by the ratio of the moduli
	for range rounds {
		if !f.Solve(v) {
			return v
		}
		top := 0.0
		for _, e := range v {
			top = math.Max(top, math.Abs(e))
		}
		for i := range v {
			v[i] /= top
		}
	}
	return v
}

// settle moves x in place to where the circuit comes to rest, roughly.
func (l *ladder) settle(x []float64) (steps int) {
	defer func() {
		l.s.Release()
		l.s.SetRamp(mna.Full)
	}()
	l.s.From(x)
	l.s.Linearise(x)
	tie := l.s.LargestConductance()
	loose := 1e-9 * tie // far below what holds any node
	trial := l.zero()
	const moves = 400
	for range moves {
		ramp := mna.Full
		ramp.Shunt = tie
		l.s.Anchor(x)
		l.s.SetRamp(ramp)
		copy(trial, x)
		l.s.From(trial)
		r := newton.Solve(l.s, trial, &l.work, newton.Options{MaxSteps: 25})
		steps += r.Steps
		// A negative determinant means that the tie is weaker than the push:
		// the step would lead back to where it came from.
		if r.Outcome != newton.Converged || l.s.DetSign(trial) < 0 {
			tie *= 4
			continue
		}
		move := distance(x, trial)
		copy(x, trial)
		l.s.SetRamp(mna.Full)
		if l.s.DetSign(x) > 0 {
			if tie < loose {
				return steps
			}
			tie /= 4
		} else if move < 1e-9 {
			return steps // at rest on an unstable point after all
		}
	}
	return steps
}
