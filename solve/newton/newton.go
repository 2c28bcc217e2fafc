// Package newton finds a root of a square system F(x) = 0 by Newton's method,
// with the one stopping rule of the project.
//
// A system may guard its own linearisation: it may answer for a tamer point than
// the one it was asked for, as long as it says so. Such an answer moves the
// iteration on but never ends it.
//
// The rule: the iteration ends at x when F was evaluated at x itself, every
// equation is balanced within the system's own tolerance there, and the Newton
// step from x is below StepLimit in every unknown. That last step is still
// taken: it is the polish, and costs no further evaluation.
//
// Sources: P. Deuflhard, Newton Methods for Nonlinear Problems, Springer 2004
// (simplified corrections and the natural monotonicity test, section 3.3).
package newton

import "math"

// StepLimit is the largest last step in an unknown, in its unit (volts):
// ARCHITECTURE's stopping rule.
const StepLimit = 1e-10

// A System is F with its Jacobian and its tolerances. It owns its workspace; a
// System must not be used by two goroutines at once.
type System interface {
	// Size is the number of unknowns and equations.
	Size() int
	// Linearise evaluates F and its Jacobian at x. It reports whether it did so
	// at x itself (true) or at a guarded point of its own choice, in which case
	// the model is F's linear continuation from there to x.
	Linearise(x []float64) (exact bool)
	// Step solves J dx = -F of the last Linearise into dx. It reports false
	// where no finite step exists.
	Step(dx []float64) bool
	// Balanced reports whether every equation of the last Linearise is within
	// its tolerance.
	Balanced() bool
}

// A Correcting system gives simplified corrections, which damping needs: with
// the Jacobian of the last Linearise and F evaluated anew at x, both exact.
type Correcting interface {
	System
	// Correct evaluates F at x and solves J dx = -F with the Jacobian of the
	// last Linearise.
	Correct(x, dx []float64) bool
}

// An Outcome is how an iteration ended.
type Outcome int

// The outcomes.
const (
	Converged Outcome = iota
	TooManySteps
	Singular
	Diverged // a step or an unknown was not finite
	Stalled  // damping found no fraction of the step that leads on
)

// String says the outcome in words, as a sentence goes on after "it".
func (o Outcome) String() string {
	switch o {
	case Converged:
		return "converged"
	case TooManySteps:
		return "did not settle in the steps allowed"
	case Singular:
		return "met balances that do not determine the voltages"
	case Diverged:
		return "ran out of range"
	default:
		return "came to a stand away from a solution"
	}
}

// Options steer an iteration. The zero value means DefaultSteps, undamped.
type Options struct {
	MaxSteps int
	// Damped takes fractions of a step by the natural monotonicity test; the
	// system must be Correcting.
	Damped bool
	// MaxMove caps each unknown's change in one damped step; 0 means no cap.
	MaxMove float64
	// OnStep, where set, is told each step: its number, its size and whether
	// the evaluation was exact.
	OnStep func(step int, size float64, exact bool)
}

// DefaultSteps is ample for a guarded iteration, which needs 5 to 15 on
// ordinary circuits; more means that another way is wanted.
const DefaultSteps = 60

// A Result is an outcome with its statistics.
type Result struct {
	Outcome  Outcome
	Steps    int     // linear systems solved, the polishing one included
	LastStep float64 // largest change of an unknown in the last step
}

// A Work holds the vectors of an iteration, so that repeated solves of one
// system allocate nothing. Its zero value is ready.
type Work struct {
	dx, trial, simple []float64
}

func (w *Work) fit(n int) {
	if len(w.dx) != n {
		w.dx, w.trial, w.simple = make([]float64, n), make([]float64, n), make([]float64, n)
	}
}

// Solve iterates from x in place. x is the root where the outcome is Converged,
// otherwise the last point reached.
func Solve(s System, x []float64, w *Work, o Options) Result {
	n := s.Size()
	w.fit(n)
	limit := o.MaxSteps
	if limit == 0 {
		limit = DefaultSteps
	}
	var r Result
	for r.Steps < limit {
		exact := s.Linearise(x)
		if !s.Step(w.dx) {
			r.Outcome = Singular
			return r
		}
		r.Steps++
		r.LastStep = largest(w.dx)
		if o.OnStep != nil {
			o.OnStep(r.Steps, r.LastStep, exact)
		}
		if !(r.LastStep <= math.MaxFloat64) {
			r.Outcome = Diverged
			return r
		}
		if exact && r.LastStep < StepLimit && s.Balanced() {
			add(x, w.dx)
			return r
		}
		if !o.Damped || !exact {
			add(x, w.dx)
			continue
		}
		if !damp(s.(Correcting), x, w, o.MaxMove, r.LastStep) {
			r.Outcome = Stalled
			return r
		}
	}
	r.Outcome = TooManySteps
	return r
}

// leastFraction ends a damped iteration: below it the path to the solution is
// not followed any more (Deuflhard's lambda_min is of this order).
const leastFraction = 1e-6

// damp moves x by the largest fraction of w.dx, halving from one, whose
// simplified correction is smaller than the step it follows.
func damp(s Correcting, x []float64, w *Work, move, size float64) bool {
	fraction := 1.0
	if move > 0 && size > move {
		fraction = move / size
	}
	before := norm2(w.dx)
	for ; fraction > leastFraction; fraction /= 2 {
		for i := range x {
			w.trial[i] = x[i] + fraction*w.dx[i]
		}
		if !s.Correct(w.trial, w.simple) {
			continue
		}
		// Deuflhard's restricted test: the correction that remains shrinks by
		// at least a quarter of the fraction taken; equality at the rounding
		// level counts as shrinking.
		after := norm2(w.simple)
		if after <= (1-fraction/4)*before || after < StepLimit {
			copy(x, w.trial)
			return true
		}
	}
	return false
}

func add(x, dx []float64) {
	dx = dx[:len(x)]
	for i := range x {
		x[i] += dx[i]
	}
}

// largest is the maximum norm; NaN counts as infinite, so that it is not lost.
func largest(v []float64) float64 {
	m := 0.0
	for _, e := range v {
		a := math.Abs(e)
		if a > m {
			m = a
		} else if a != a {
			return math.Inf(1)
		}
	}
	return m
}

func norm2(v []float64) float64 {
	s := 0.0
	for _, e := range v {
		s += e * e
	}
	return math.Sqrt(s)
}
