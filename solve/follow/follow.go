package follow

import (
	"math"
	"slices"
)

// Limits of the corrector.
const (
	// looseMove ends the corrections of an ordinary step: Newton's method
	// converges quadratically there, and the last move is taken.
	looseMove = 1e-6
	// tightMove ends the corrections of a refined point; with the last move
	// taken, what remains is rounding.
	tightMove = 1e-10
	// A step that needs more corrections than this was too long.
	looseCorrections = 8
	// A refined point starts close by; corrections beyond a few only go on
	// while the balances are not met.
	tightCorrections = 25
)

// Nominal values of the step control, after Allgower and Georg's algorithm
// 6.1.10: what a step of the right length shows. A step that shows four times as
// much (twice, for the angle) is repeated.
const (
	nominalContraction = 0.25 // second correction over first
	nominalAngle       = 0.25 // between tangents, in radians: 14 degrees
	worstRatio         = 2.0  // of the length taken to the right one
	slowest, fastest   = 0.25, 2.0
	// longest bounds a step's change of any unknown, in its scale, where the
	// branch is straight: a straight line must not lead over a whole curve.
	longest = 10.0
)

// A walk is one call of Follow. Points z are x with λ appended; lengths are
// measured in scale, by the largest component.
type walk struct {
	p     Problem
	o     Options
	n     int
	scale []float64
	sys   *bordered
	res   Result

	start, tStart []float64
	z, t          []float64 // the last point, its tangent of length 1
	border        []float64 // c with c·t = 1: a step s ends on the plane c·(y - z) = s
	sign          int       // of det J at z
	h             float64   // length of the next step
	y, u          []float64 // the point tried, its tangent
	probe, uProbe []float64 // the point located inside a step, its tangent
	crossed       bool      // the step tried passes a point where branches cross
}

// Follow walks along a branch of p from the solution near x0 at lambda0; x0 is
// not modified. The start must not be a fold: λ must be able to move.
func Follow(p Problem, x0 []float64, lambda0 float64, o Options) Result {
	o.complete(lambda0)
	n := p.Size()
	vector := func() []float64 { return make([]float64, n+1) }
	w := &walk{
		p: p, o: o, n: n, sys: newBordered(p), scale: vector(),
		z: vector(), t: vector(), border: vector(), y: vector(), u: vector(),
		probe: vector(), uProbe: vector(),
	}
	copy(w.scale, p.XScale())
	w.scale[n] = o.LambdaScale
	copy(w.z, x0)
	w.z[n] = lambda0
	w.res.Outcome = w.run()
	if w.res.X == nil {
		w.res.Point = Point{X: slices.Clone(w.z[:n]), Lambda: w.z[n], DetSign: w.sign}
	}
	return w.res
}

func (w *walk) run() Outcome {
	if !w.begin() {
		return BadStart
	}
	if !w.show(w.z) {
		return Stopped
	}
	lambda := w.z[w.n]
	if w.o.Use != NoTarget && lambda == w.o.Target {
		w.res.Targets = append(w.res.Targets, Point{X: slices.Clone(w.z[:w.n]), Lambda: lambda, DetSign: w.sign})
		if w.o.Use == FirstPassage {
			return Reached
		}
	}
	if outward := w.t[w.n]; outward > 0 && lambda >= w.o.High || outward < 0 && lambda <= w.o.Low {
		return RangeEnd
	}
	for w.res.Stats.Steps < w.o.MaxSteps {
		ratio, ok := w.try()
		sign := w.sign
		var hits []hit
		if ok && ratio <= worstRatio {
			sign = w.p.DetSign()
			hits, ok = w.search()
		}
		if !ok || ratio > worstRatio {
			w.res.Stats.Rejected++
			w.h *= max(slowest, min(1/ratio, 0.5))
			if w.h < w.o.MinStep || w.o.Mode == Natural && w.h*math.Abs(w.t[w.n]) < w.o.MinStep*w.scale[w.n] {
				return w.stuck()
			}
			continue
		}
		w.res.Stats.Steps++
		if w.crossed {
			w.res.Stats.BranchPoints++
		}
		for _, h := range hits {
			if h.note != nil {
				h.note()
			}
			if h.final {
				w.res.Point = h.point()
				w.show(h.z)
				return h.end
			}
		}
		w.z, w.y = w.y, w.z
		w.t, w.u = w.u, w.t
		w.sign = sign
		if !w.show(w.z) {
			return Stopped
		}
		w.aim()
		w.h *= max(slowest, min(fastest, 1/ratio))
		w.limit()
	}
	return OutOfSteps
}

// begin settles the first point and its tangent.
func (w *walk) begin() bool {
	w.border[w.n] = 1
	if _, ok := w.correct(w.z, true, settled); !ok {
		return false
	}
	move, ok := w.sys.solve(nil, 0, 1)
	if !ok {
		return false
	}
	copy(w.t, move)
	w.sign = w.p.DetSign()
	normalise(w.t, w.scale, float64(w.o.Direction))
	w.aim()
	w.h = w.o.InitialStep / math.Abs(w.t[w.n])
	w.limit()
	w.start, w.tStart = slices.Clone(w.z), slices.Clone(w.t)
	return true
}

// aim sets the border for the steps from z.
func (w *walk) aim() {
	clear(w.border)
	if w.o.Mode == Natural {
		w.border[w.n] = 1 / w.t[w.n]
		return
	}
	sum := 0.0
	for i, t := range w.t {
		w.border[i] = t / (w.scale[i] * w.scale[i])
		sum += w.border[i] * t
	}
	for i := range w.border {
		w.border[i] /= sum
	}
}

// limit keeps the next step within bounds. In Natural mode λ stays within its
// range, and lands on the target rather than beyond it.
func (w *walk) limit() {
	t := w.t[w.n]
	w.h = min(w.h, longest, w.o.MaxStep/math.Abs(t))
	if w.o.Mode != Natural {
		return
	}
	bound := w.o.High
	if t < 0 {
		bound = w.o.Low
	}
	w.h = min(w.h, (bound-w.z[w.n])/t)
	if left := (w.o.Target - w.z[w.n]) / t; w.o.Use == FirstPassage && left > 0 {
		w.h = min(w.h, left)
	}
}

// try takes a step of length h to y with tangent u. ratio is the length taken
// over the right one.
func (w *walk) try() (ratio float64, ok bool) {
	w.crossed = false
	for i := range w.y {
		w.y[i] = w.z[i] + w.h*w.t[i]
	}
	if w.o.Mode == Natural {
		w.y[w.n] = w.snap(w.y[w.n])
	}
	contraction, ok := w.correct(w.y, w.o.Mode == Natural, loose)
	if !ok || !w.tangent(w.u) {
		return 1, false
	}
	distance := 0.0
	for i, s := range w.scale {
		distance = max(distance, math.Abs(w.y[i]-w.z[i]-w.h*w.t[i])/s)
	}
	ratio = math.Sqrt(max(distance/w.o.Error, contraction/nominalContraction))
	ratio = max(ratio, w.angle(w.t, w.u)/nominalAngle)
	if ratio > worstRatio {
		return ratio, true
	}
	// Along one branch det J and dλ/ds change sign together; if one does alone,
	// the step has changed to another branch, or another branch crosses here.
	// Shorter steps tell the two apart.
	if !w.opposed(w.u) {
		return ratio, true
	}
	if w.h > closestCrossing {
		return 2 * worstRatio, true
	}
	w.crossed = true
	return ratio, true
}

// closestCrossing is the length of a step that may pass a crossing of branches.
// Branches that miss each other by less are not told from ones that cross; and
// no closer to a crossing than about this are points corrected, as their error
// there is that of the balances over the distance.
const closestCrossing = 1e-5

// opposed reports whether the sense of the walk changed between z and the point
// linearised last, whose tangent is u. On a regular branch det [J b; tᵀ] keeps
// its sign, which is that of det J times dλ/ds.
func (w *walk) opposed(u []float64) bool {
	if math.Abs(u[w.n]) < flat*w.scale[w.n] || math.Abs(w.t[w.n]) < flat*w.scale[w.n] {
		return false
	}
	return (w.p.DetSign() == w.sign) != (u[w.n]*w.t[w.n] > 0)
}

// flat: so close to a fold det J and dλ/ds, both nearly 0, need not change sign
// at the same double.
const flat = 1e-6

// A goal is how well a point is to be corrected.
type goal int

const (
	loose   goal = iota // well enough to walk on
	tight               // to rounding
	settled             // to rounding, and all balances are met
)

// correct moves y to the branch within the plane through y of the border, or at
// its λ if plain, by Newton's method. contraction is the size of its second move
// over that of the first.
func (w *walk) correct(y []float64, plain bool, g goal) (contraction float64, ok bool) {
	limit, count := tightMove, tightCorrections
	if g == loose {
		limit, count = looseMove, looseCorrections
	}
	last := 0.0
	for i := range count {
		w.res.Stats.Corrections++
		if !w.p.Linearise(y[:w.n], y[w.n]) || !w.sys.prepare(w.border, plain) {
			return contraction, false
		}
		f, tol := w.p.Residual()
		balanced := g != settled || within(f, tol)
		move, ok := w.sys.solve(f, -1, 0)
		if !ok {
			return contraction, false
		}
		size := 0.0
		for j, m := range move {
			y[j] += m
			size = max(size, math.Abs(m)/w.scale[j])
		}
		if i == 1 && size > limit {
			contraction = size / last
		}
		// Where rounding makes the moves tremble above the limit they no longer
		// halve, and there is nothing to gain.
		trembling := i >= 3 && size <= looseMove && size > last/2
		if balanced && (size <= limit || trembling) {
			return contraction, true
		}
		// Newton's method that does not contract has lost its branch. Refined
		// points start beside theirs.
		if g == loose && i > 0 && size > last {
			return contraction, false
		}
		last = size
	}
	return contraction, false
}

// tangent stores the unit tangent at the point corrected last, in the sense of
// the border.
func (w *walk) tangent(u []float64) bool {
	move, ok := w.sys.solve(nil, 0, 1)
	if !ok {
		return false
	}
	copy(u, move)
	return normalise(u, w.scale, 1)
}

// normalise makes t one long and multiplies it by sign.
func normalise(t, scale []float64, sign float64) bool {
	size := 0.0
	for i, v := range t {
		size = max(size, math.Abs(v)/scale[i])
	}
	if size == 0 || math.IsInf(size, 0) {
		return false
	}
	for i := range t {
		t[i] *= sign / size
	}
	return true
}

// snap returns the target or bound that λ was meant to land on and missed by
// rounding.
func (w *walk) snap(lambda float64) float64 {
	for _, v := range []float64{w.o.Low, w.o.High, w.o.Target} {
		if math.Abs(lambda-v) < 4*epsilon*(math.Abs(v)+math.Abs(w.z[w.n])) {
			return v
		}
	}
	return lambda
}

// angle between two tangents, in scaled space.
func (w *walk) angle(a, b []float64) float64 {
	var aa, bb, ab float64
	for i, s := range w.scale {
		p, q := a[i]/s, b[i]/s
		aa, bb, ab = aa+p*p, bb+q*q, ab+p*q
	}
	// The cosine of a small angle rounds to 1, which is as good as 0 here.
	return math.Acos(max(-1, min(1, ab/math.Sqrt(aa*bb))))
}

// stuck names the end of a walk whose smallest step failed.
func (w *walk) stuck() Outcome {
	// A Natural walk runs into a fold with a tangent that grows ever steeper.
	if w.o.Mode == Natural && math.Abs(w.t[w.n])/w.scale[w.n] < steep {
		return Folded
	}
	return Stuck
}

// steep: at λ's distance d from a fold the slope is about 1/(2 sqrt d), so that a
// walk which ends for another reason rarely has one this large.
const steep = 1e-2

func (w *walk) show(z []float64) bool {
	return w.o.OnPoint == nil || w.o.OnPoint(z[:w.n], z[w.n])
}

func within(f, tol []float64) bool {
	for i, v := range f {
		if !(math.Abs(v) <= tol[i]) {
			return false
		}
	}
	return true
}
