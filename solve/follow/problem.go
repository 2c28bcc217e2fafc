// Package follow follows the solutions of a square system F(x, λ) = 0 while its
// parameter λ changes.
//
// The solutions form curves, the branches. [Follow] walks along one of them:
// from a solution it predicts along the tangent, corrects by Newton's method,
// and judges by what the correction had to do how far it may go next. In Natural
// mode λ itself is advanced; in ArcLength mode the walk is along the curve, so
// that it passes folds, where λ turns back.
//
// On the way it can stop at, or collect, passages through a value of λ, folds,
// and sign changes of margins; each is refined to the accuracy of the system.
//
// Literature: E. L. Allgower and K. Georg, Introduction to Numerical
// Continuation Methods, SIAM 2003, chapter 6 (step control by contraction,
// distance and angle); H. B. Keller, Numerical solution of bifurcation and
// nonlinear eigenvalue problems, in: Applications of Bifurcation Theory, 1977
// (pseudo arc length); W. Govaerts, Stable solvers and block elimination for
// bordered systems, SIAM J. Matrix Anal. Appl. 12 (1991) 469-483.
package follow

import "math"

// A Problem is F(x, λ) with its Jacobian J = ∂F/∂x, two scales and
// tolerances. It owns its workspace; the slices it returns are read at once and
// not kept.
type Problem interface {
	// Size is the number of equations and of unknowns.
	Size() int
	// XScale is a typical size of each unknown, positive, constant. Distances
	// are measured in it.
	XScale() []float64
	// Linearise evaluates F, J and ∂F/∂λ at (x, λ), and factorises J. It is
	// false if one of them is not finite or J cannot be factorised; a J close to
	// singular should be let through, for the walk has to pass there.
	Linearise(x []float64, lambda float64) (ok bool)
	// Residual is F at the last linearisation, and how large each equation may
	// be for a solution.
	Residual() (f, tol []float64)
	// DLambda stores ∂F/∂λ.
	DLambda(dst []float64)
	// Solve replaces b by J⁻¹ b.
	Solve(b []float64) (ok bool)
	// SolveT replaces b by J⁻ᵀ b.
	SolveT(b []float64) (ok bool)
	// DetSign is the sign of det J, +1 or -1.
	DetSign() int
}

// A Mode is what the walk advances.
type Mode int

// The modes.
const (
	ArcLength Mode = iota // along the curve, through folds
	Natural               // λ; cheaper, ends at a fold
)

// A Use says what happens at passages of λ through Options.Target.
type Use int

// The uses of a target.
const (
	NoTarget     Use = iota
	FirstPassage     // end there
	EveryPassage     // collect and go on
)

// An Event is a signed margin watched along the branch.
type Event struct {
	// Margin must be continuous along the branch. It must not keep x.
	Margin func(x []float64, lambda float64) float64
	// Stop ends the walk at the first sign change.
	Stop bool
}

// Options steer a walk. The zero value walks along the arc towards larger λ,
// without end but the step budget.
type Options struct {
	Mode Mode
	// Direction is +1 or -1, the sense in which λ starts; 0 means towards the
	// target if there is one, otherwise +1.
	Direction int
	// Low and High bound λ; both 0 means no bounds. The walk ends on a bound.
	Low, High float64
	Target    float64
	Use       Use
	// StopAtFold ends an ArcLength walk at the first fold.
	StopAtFold bool
	Events     []Event
	// MaxSteps is the step budget; 0 means DefaultSteps.
	MaxSteps int
	// InitialStep and MaxStep limit the change of λ in the first step and in
	// any, in λ's unit; 0 means 0.01 and 0.1 times LambdaScale.
	InitialStep, MaxStep float64
	// MinStep is the smallest step, measured in the largest change of an
	// unknown over its scale; 0 means 1e-10.
	MinStep float64
	// Error is the distance, in scales, that a correction should cover; 0 means
	// 0.02. Twice the step covers four times the distance.
	Error float64
	// LambdaScale is a typical size of λ; 0 means 1.
	LambdaScale float64
	// OnPoint, where set, is shown each point of the walk in order, the first
	// and the last included. It must not keep x. Ordinary points are within about
	// 1e-6 scales of the branch, and mostly much nearer. Where it returns false
	// the walk ends.
	OnPoint func(x []float64, lambda float64) (goOn bool)
}

// DefaultSteps is a budget that branches of circuits with a few dozen junctions
// stay well below.
const DefaultSteps = 5000

func (o *Options) complete(lambda float64) {
	if o.LambdaScale == 0 {
		o.LambdaScale = 1
	}
	def := func(v *float64, value float64) {
		if *v == 0 {
			*v = value
		}
	}
	def(&o.InitialStep, 0.01*o.LambdaScale)
	def(&o.MaxStep, 0.1*o.LambdaScale)
	def(&o.MinStep, 1e-10)
	def(&o.Error, 0.02)
	if o.MaxSteps == 0 {
		o.MaxSteps = DefaultSteps
	}
	if o.Low == 0 && o.High == 0 {
		o.Low, o.High = math.Inf(-1), math.Inf(1)
	}
	if o.Direction == 0 {
		o.Direction = 1
		if o.Use != NoTarget && o.Target < lambda {
			o.Direction = -1
		}
	}
}

// An Outcome is how a walk ended.
type Outcome int

// The outcomes.
const (
	Reached    Outcome = iota // at the target
	Folded                    // at a fold: StopAtFold, or a Natural walk that could go no further
	Stopped                   // at an event with Stop, or by OnPoint
	RangeEnd                  // at Low or High
	Closed                    // back at the start: the branch is a loop
	OutOfSteps                // the step budget is spent
	Stuck                     // the smallest step failed
	BadStart                  // no solution near the start, or no direction from it
)

// String says the outcome in words, as a sentence goes on after "the walk".
func (o Outcome) String() string {
	return [...]string{
		"reached the target", "came to a fold", "was stopped by an event", "came to the end of the range",
		"came back to its start", "ran out of steps", "could go no further", "found no solution to start from",
	}[o]
}

// A Point is a point of the branch.
type Point struct {
	X      []float64
	Lambda float64
	// DetSign is the sign of det J, +1 or -1; at a fold it has no meaning.
	DetSign int
}

// A Crossing is a sign change of a margin.
type Crossing struct {
	Event int // index into Options.Events
	// Point lies on the side where the margin is not negative, next to the
	// crossing.
	Point
	// Falling is true if the margin becomes negative in the sense of the walk.
	Falling bool
}

// A Result says how a walk went.
type Result struct {
	Outcome Outcome
	// Point is the last one: refined if the walk ended at something it looked
	// for, otherwise an ordinary point.
	Point
	// Targets are the passages through Options.Target, in order; with
	// FirstPassage one, the last point.
	Targets   []Point
	Folds     []Point
	Crossings []Crossing
	Stats     Stats
}

// Stats count what a walk cost.
type Stats struct {
	Steps        int // steps accepted
	Rejected     int // steps tried in vain
	Corrections  int // linearisations
	BranchPoints int // points passed where another branch crosses
}
