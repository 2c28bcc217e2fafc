package follow

import (
	"math"
	"slices"
	"sort"
)

const (
	// foldWidth is the width, relative to a step, to which a fold is bracketed:
	// λ is stationary there, so that its error is of the order of the square.
	foldWidth = 1e-10
	// crossingWidth is the same for margins and passages: some roundings.
	crossingWidth = 1e-15
	// slopeMove is the move, in scales, by which a margin's slope is measured:
	// near the root of the double precision, as customary for differences.
	slopeMove = 1e-7
	// A dip is looked into if the cubic through the margins and their slopes at
	// both ends falls below this share of the nearer margin.
	dipShare = 0.5
	// maxHalvings bounds how often a dip is looked into anew.
	maxHalvings = 6
	// A branch is closed if it passes the start this close, in scales, and within
	// this angle.
	closedDistance, closedAngle = 1e-6, 0.01
)

// A hit is something found inside a step, at the length s from its start.
type hit struct {
	s     float64
	z     []float64 // with λ
	note  func()    // records it; nil for none
	end   Outcome
	final bool // the walk ends here, by end
	sign  int  // of det J
}

// A knot is a point of the step just taken, with margins and their slopes along s.
type knot struct {
	s              float64
	z              []float64
	margin, slopes []float64
}

// search lists what lies between z and y in order. It is not ok if something
// could not be refined; then the step must be repeated shorter.
func (w *walk) search() (hits []hit, ok bool) {
	// Refining linearises elsewhere, and leaves y and u as they are.
	knots := []knot{w.knot(0, w.z, w.t)}
	if w.t[w.n]*w.u[w.n] < 0 {
		s, ok := w.fold()
		if !ok {
			return nil, false
		}
		knots = append(knots, w.knot(s, slices.Clone(w.probe), w.uProbe))
		fold := w.here(s)
		fold.end, fold.final = Folded, w.o.StopAtFold
		fold.note = func() { w.res.Folds = append(w.res.Folds, fold.point()) }
		hits = append(hits, fold)
	}
	knots = append(knots, w.knot(w.h, w.y, w.u))
	for i := range knots[1:] {
		if hits, ok = w.passages(hits, knots[i], knots[i+1]); !ok {
			return nil, false
		}
		for e := range w.o.Events {
			if hits, ok = w.crossings(hits, e, knots[i], knots[i+1], maxHalvings); !ok {
				return nil, false
			}
		}
	}
	if w.closes() {
		closed := w.here(0)
		closed.s, closed.end, closed.final = w.h, Closed, true
		hits = append(hits, closed)
	}
	sort.SliceStable(hits, func(i, j int) bool { return hits[i].s < hits[j].s })
	return hits, true
}

func (h hit) point() Point {
	n := len(h.z) - 1
	return Point{X: h.z[:n:n], Lambda: h.z[n], DetSign: h.sign}
}

// here makes a hit of the point located last.
func (w *walk) here(s float64) hit {
	return hit{s: s, z: slices.Clone(w.probe), sign: w.p.DetSign()}
}

func (w *walk) knot(s float64, z, t []float64) knot {
	k := knot{s: s, z: z}
	if len(w.o.Events) == 0 {
		return k
	}
	speed := dot(w.border, t) // ds along t
	moved := make([]float64, w.n+1)
	for i := range z {
		moved[i] = z[i] + slopeMove*t[i]
	}
	for _, e := range w.o.Events {
		m := e.Margin(z[:w.n], z[w.n])
		k.margin = append(k.margin, m)
		k.slopes = append(k.slopes, (e.Margin(moved[:w.n], moved[w.n])-m)/(slopeMove*speed))
	}
	return k
}

// locate puts the point at length s of the step into probe and its tangent into
// uProbe, starting from the cubic through the step's ends and tangents. It is
// false if there is no such point, or if the plane at s cuts the branch
// elsewhere, where it is passed the other way, and that point was found.
func (w *walk) locate(s float64) bool {
	x := s / w.h
	speed := dot(w.border, w.u)
	// Hermite's basis.
	h00, h10 := (1+2*x)*(1-x)*(1-x), x*(1-x)*(1-x)
	h01, h11 := x*x*(3-2*x), x*x*(x-1)
	for i := range w.probe {
		w.probe[i] = h00*w.z[i] + h01*w.y[i] + w.h*(h10*w.t[i]+h11*w.u[i]/speed)
	}
	_, ok := w.correct(w.probe, w.o.Mode == Natural, tight)
	return ok && w.tangent(w.uProbe) && (w.crossed || !w.opposed(w.uProbe))
}

// fold locates the point where dλ/ds changes sign.
func (w *walk) fold() (s float64, ok bool) {
	slope := func(s float64) (float64, bool) {
		ok := w.locate(s)
		return w.uProbe[w.n], ok
	}
	s, _, ok = zero(slope, 0, w.h, w.t[w.n], w.u[w.n], foldWidth*w.h)
	return s, ok && w.locate(s)
}

// passages finds where λ passes the target and the bounds. Between a and b it is
// monotonic.
func (w *walk) passages(hits []hit, a, b knot) ([]hit, bool) {
	from, to := a.z[w.n], b.z[w.n]
	passes := func(v float64) bool { return (from < v && v <= to) || (to <= v && v < from) }
	if w.o.Use != NoTarget && passes(w.o.Target) {
		h, ok := w.land(w.o.Target, a, b)
		if !ok {
			return nil, false
		}
		h.note = func() { w.res.Targets = append(w.res.Targets, h.point()) }
		h.end, h.final = Reached, w.o.Use == FirstPassage
		hits = append(hits, h)
	}
	bound := w.o.High
	if to < from {
		bound = w.o.Low
	}
	if passes(bound) {
		h, ok := w.land(bound, a, b)
		if !ok {
			return nil, false
		}
		h.end, h.final = RangeEnd, true
		hits = append(hits, h)
	}
	return hits, true
}

// land finds the point between a and b with exactly this λ.
func (w *walk) land(lambda float64, a, b knot) (hit, bool) {
	beyond := func(s float64) (float64, bool) {
		ok := w.locate(s)
		return w.probe[w.n] - lambda, ok
	}
	s, _, ok := zero(beyond, a.s, b.s, a.z[w.n]-lambda, b.z[w.n]-lambda, crossingWidth*w.h)
	if !ok || !w.locate(s) {
		return hit{}, false
	}
	w.probe[w.n] = lambda
	if _, ok := w.correct(w.probe, true, settled); !ok {
		return hit{}, false
	}
	return w.here(s), true
}

// crossings finds where the margin of event e changes sign between a and b. If
// it has the same sign at both, it may still dip below zero in between.
func (w *walk) crossings(hits []hit, e int, a, b knot, halvings int) ([]hit, bool) {
	margin := w.o.Events[e].Margin
	ma, mb := a.margin[e], b.margin[e]
	if (ma < 0) == (mb < 0) {
		s, found := dip(a, b, e)
		if !found || halvings == 0 {
			return hits, true
		}
		if !w.locate(s) {
			return nil, false
		}
		middle := w.knot(s, slices.Clone(w.probe), w.uProbe)
		hits, ok := w.crossings(hits, e, a, middle, halvings-1)
		if !ok {
			return nil, false
		}
		return w.crossings(hits, e, middle, b, halvings-1)
	}
	value := func(s float64) (float64, bool) {
		ok := w.locate(s)
		return margin(w.probe[:w.n], w.probe[w.n]), ok
	}
	s, across, ok := zero(value, a.s, b.s, ma, mb, crossingWidth*w.h)
	if !ok {
		return nil, false
	}
	m, ok := value(s)
	if ok && m < 0 {
		s = across
		_, ok = value(s)
	}
	if !ok {
		return nil, false
	}
	h := w.here(s)
	h.note = func() {
		w.res.Crossings = append(w.res.Crossings, Crossing{Event: e, Point: h.point(), Falling: !(ma < 0)})
	}
	h.end, h.final = Stopped, w.o.Events[e].Stop
	return append(hits, h), true
}

// dip finds where, between a and b, the cubic through the margins and slopes of
// event e comes nearest to zero, if that is worth looking into.
func dip(a, b knot, e int) (s float64, found bool) {
	width := b.s - a.s
	va, vb := a.margin[e], b.margin[e]
	da, db := a.slopes[e]*width, b.slopes[e]*width
	if va < 0 {
		va, vb, da, db = -va, -vb, -da, -db
	}
	if !(da < 0 && db > 0) {
		return 0, false
	}
	// The cubic is va + da x + q x² + r x³; it falls at 0 and rises at 1.
	q, r := 3*(vb-va)-2*da-db, da+db-2*(vb-va)
	// The root of da + 2 q x + 3 r x² where it rises, in the form that does not
	// cancel.
	root := math.Sqrt(max(0, q*q-3*r*da))
	x := -da / (q + root)
	if q < 0 {
		x = (root - q) / (3 * r)
	}
	if !(x > 0 && x < 1) {
		return 0, false
	}
	return a.s + x*width, va+x*(da+x*(q+x*r)) < dipShare*min(va, vb)
}

// closes reports whether the step passes the start of the walk, and leaves that
// point in probe.
func (w *walk) closes() bool {
	if w.o.Mode == Natural {
		return false
	}
	ahead := func(z []float64) float64 {
		sum := 0.0
		for i, v := range z {
			sum += (v - w.start[i]) * w.tStart[i] / (w.scale[i] * w.scale[i])
		}
		return sum
	}
	from, to := ahead(w.z), ahead(w.y)
	if !(from < 0 && to >= 0) || w.distance(w.z, w.start) > 2*w.h {
		return false
	}
	s, _, ok := zero(func(s float64) (float64, bool) {
		ok := w.locate(s)
		return ahead(w.probe), ok
	}, 0, w.h, from, to, foldWidth*w.h)
	return ok && w.locate(s) &&
		w.distance(w.probe, w.start) < closedDistance && w.angle(w.uProbe, w.tStart) < closedAngle
}

// distance is the largest difference in scales.
func (w *walk) distance(a, b []float64) float64 {
	d := 0.0
	for i, v := range a {
		d = max(d, math.Abs(v-b[i])/w.scale[i])
	}
	return d
}
