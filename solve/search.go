package solve

import (
	"errors"
	"math"
	"sort"
	"time"

	"biaswright/netlist"
	"biaswright/solve/every"
	"biaswright/solve/follow"
	"biaswright/solve/interval"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// EveryOptions steer a search for all operating points.
type EveryOptions struct {
	Options
	// Budget ends the search; 0 is none.
	Budget time.Duration
	// Workers is how many boxes are looked at at a time; 0 is one. The answer is the
	// same.
	Workers int
	// Quick follows branches through folds and looks away from what is known, instead of
	// searching everywhere: it proves nothing.
	Quick bool
}

// A Search is how far a list of operating points can be trusted.
type Search struct {
	// Proven tells that the list is complete within Scope; otherwise Open boxes
	// remain, or the search was a quick one.
	Proven      bool
	Scope       mna.Scope
	Boxes, Open int
	// Signs is the sum of the determinant signs, +1 over a complete list. A pair of
	// points that is missing does not show in it.
	Signs int
	// Leaks tells that some transistor has a recombination current: without one a
	// dead state may not exist in this model.
	Leaks bool
}

// An EveryResult is all operating points found. Point is the one that Solve would choose,
// Others the rest by their node voltages.
type EveryResult struct {
	Result
	Search Search
	// Reached is the point that the supplies, raised together from zero, lead to: 0 is
	// Point, i + 1 is Others[i]; -1 where the way turns back or ends before the full
	// supplies, at TurnsAt of them.
	Reached int
	TurnsAt float64
	// enclosed holds for each point, in the same order, the box in which it surely lies;
	// nil where it was not verified.
	enclosed [][]interval.I
}

// All are the points, the chosen one first.
func (r *EveryResult) All() []*Point { return append([]*Point{r.Point}, r.Others...) }

// Verified tells whether point i, in All's order, is proven to exist within the search's
// scope; others stand as the solver left them.
func (r *EveryResult) Verified(i int) bool { return r.enclosed[i] != nil }

// ErrNotSearched is wrapped where a circuit is of a kind that cannot be searched for all
// its operating points.
var ErrNotSearched = mna.ErrNoNeutral

// Every finds all operating points of c. The error is as Solve's, or wraps
// ErrNotSearched.
func Every(c *netlist.Circuit, o EveryOptions) (*EveryResult, error) {
	s, err := mna.New(c)
	if err != nil {
		return nil, err
	}
	l := &ladder{s: s, o: o.Options}
	l.climb()
	if o.Quick {
		l.all()
	}
	first, err := l.result()
	var failure *Failure
	if err != nil && !errors.As(err, &failure) {
		return nil, err
	}
	sys, scope, wrong := s.Neutral()
	if wrong != nil {
		return nil, wrong
	}
	r := &EveryResult{Search: Search{Scope: scope, Leaks: leaks(c)}}
	known := []*Point{}
	if first != nil {
		known = append(append(known, first.Point), first.Others...)
	}
	options := every.Options{Budget: o.Budget, Workers: o.Workers, Known: unknowns(known)}
	var found *every.Result
	if o.Quick {
		found = every.Away(sys, options)
	} else {
		found = every.Search(sys, options)
		r.Search.Proven = found.Open == 0
	}
	r.Search.Boxes, r.Search.Open = found.Boxes, found.Open
	r.gather(s, known, found)
	if len(r.points()) == 0 {
		return nil, err
	}
	r.Tried = l.tried
	r.reach(s)
	return r, nil
}

// all climbs every rung, whatever was found before, and then follows every branch.
func (l *ladder) all() {
	l.thorough = true
	for _, r := range rungs {
		l.try(r)
	}
	l.try(rung{"branches", (*ladder).around})
}

func unknowns(points []*Point) [][]float64 {
	var out [][]float64
	for _, p := range points {
		out = append(out, p.x)
	}
	return out
}

// leaks tells whether the model of some transistor has a recombination current.
func leaks(c *netlist.Circuit) bool {
	for i := range c.Elements {
		e := &c.Elements[i]
		if e.Kind != netlist.TransistorPart {
			continue
		}
		if at := c.Parts[e.Part].Kind.Index("Irec"); at >= 0 && c.Value(e.Params[at]) > 0 {
			return true
		}
	}
	return false
}

func (r *EveryResult) points() []*Point {
	if r.Point == nil {
		return r.Others
	}
	return r.All()
}

// gather makes points of what was found, those that the ladder has kept as they are.
func (r *EveryResult) gather(s *mna.System, known []*Point, found *every.Result) {
	type one struct {
		p   *Point
		box []interval.I
	}
	var all []one
	used := make([]bool, len(found.Points))
	for _, p := range known {
		o := one{p: p}
		if i := nearest(found.Points, used, p.x); i >= 0 {
			used[i], o.box = true, found.Points[i].X
		}
		all = append(all, o)
	}
	var work newton.Work
	for i, f := range found.Points {
		if used[i] {
			continue
		}
		x := make([]float64, s.Size())
		for k := range x {
			x[k] = f.X[k].Mid()
		}
		at := append([]float64(nil), x...)
		s.SetRamp(mna.Full)
		s.From(at)
		steps := 0
		n := newton.Solve(s, at, &work, newton.Options{MaxSteps: 20})
		if steps = n.Steps; n.Outcome == newton.Converged && near(f.X, at) {
			x = at
		}
		p := newPoint(s, x, Evidence{Way: "search", Steps: steps, LastStep: n.LastStep, Determinant: s.DetSign(x), Attempts: 1})
		all = append(all, one{p, f.X})
	}
	if len(known) == 0 && len(all) > 0 { // the ladder has none: take the best
		best := 0
		for i := range all {
			if better(all[i].p, all[best].p) {
				best = i
			}
		}
		all[0], all[best] = all[best], all[0]
	}
	if len(all) == 0 {
		return
	}
	sort.SliceStable(all[1:], func(i, j int) bool { return below(all[1+i].p, all[1+j].p) })
	for i, o := range all {
		r.enclosed = append(r.enclosed, o.box)
		if i == 0 {
			r.Point = o.p
		} else {
			r.Others = append(r.Others, o.p)
		}
		r.Search.Signs += o.p.Evidence.Determinant
	}
}

// nearest is the unused point of a search that unknowns lie at; -1 where there is none.
func nearest(points []*every.Point, used []bool, x []float64) int {
	best, least := -1, math.Inf(1)
	for i, p := range points {
		if used[i] || !near(p.X, x) {
			continue
		}
		far := 0.0
		for k := range x {
			far = math.Max(far, math.Abs(p.X[k].Mid()-x[k]))
		}
		if far < least {
			best, least = i, far
		}
	}
	return best
}

// near tells whether unknowns lie in a verified box, or beside it by what a solver leaves.
func near(box []interval.I, x []float64) bool {
	const left = 1e-9 // V
	for i := range x {
		if x[i] < box[i].Lo-left || x[i] > box[i].Hi+left {
			return false
		}
	}
	return true
}

// below orders points by the first node voltage that differs.
func below(a, b *Point) bool {
	const alike = 1e-9 // V
	for n := range a.NodeV {
		if d := a.NodeV[n] - b.NodeV[n]; math.Abs(d) > alike {
			return d < 0
		}
	}
	return false
}

// reach follows the circuit from no supply to its full supplies, as they are raised, and
// tells which point that leads to.
func (r *EveryResult) reach(s *mna.System) {
	r.Reached, r.TurnsAt = -1, 0
	w := follow.Follow(s.Sources(), make([]float64, s.Size()), 0, follow.Options{
		Mode: follow.ArcLength, Target: 1, Use: follow.FirstPassage, Low: sourceLow, High: sourceHigh, StopAtFold: true, MaxSteps: arcSteps,
	})
	s.SetRamp(mna.Full)
	if len(w.Targets) == 0 {
		r.TurnsAt = w.Lambda
		if len(w.Folds) > 0 {
			r.TurnsAt = w.Folds[0].Lambda
		}
		return
	}
	least := math.Inf(1)
	for i, p := range r.All() {
		far := 0.0
		for k, x := range w.Targets[0].X {
			far = math.Max(far, math.Abs(x-p.x[k]))
		}
		if far < least {
			least, r.Reached = far, i
		}
	}
}

// boxWork bounds the circuits that the last rung searches, by unknowns and products, and
// mostBoxes how many boxes it looks at: a second or so.
const boxWork, mostBoxes = 128, 400

// boxes narrows boxes until a point is found, where no other way has found any.
func (l *ladder) boxes() (int, string) {
	if len(l.found) > 0 {
		return 0, "a point is known"
	}
	return l.search()
}

// search narrows boxes until the points are found.
func (l *ladder) search() (int, string) {
	sys, _, err := l.s.Neutral()
	if err != nil {
		return 0, err.Error()
	}
	if sys.N+len(sys.Prods) > boxWork {
		return 0, "the circuit is too large for it"
	}
	found := every.Search(sys, every.Options{MostBoxes: mostBoxes})
	if len(found.Points) == 0 {
		if found.Open == 0 {
			return 0, "no operating point lies in what it searched"
		}
		return 0, "it found none"
	}
	steps, ended := 0, ""
	for _, p := range found.Points {
		x := make([]float64, sys.N)
		for i := range x {
			x[i] = p.X[i].Mid()
		}
		l.s.From(x)
		steps, ended = l.land(x, steps, newton.Options{})
	}
	return steps, ended
}

// A certificate may cost a few milliseconds: certifyWork bounds the unknowns and Early
// products of the circuits that Certify looks at, since inverses grow with the cube, and
// certifyBoxes how many boxes of the search it does.
const certifyWork, certifyBoxes = 32, 8

// Certify tries to prove, at small cost, that the point of a result is the only one. The
// Search is nil where it does not; other points that it meets then are added to Others.
// A linear circuit needs no proof, and has none.
func (r *Result) Certify() *Search {
	p := r.Point
	s, err := mna.New(p.Circuit)
	if err != nil || s.Size() > certifyWork {
		return nil
	}
	sys, scope, err := s.Neutral()
	if err != nil || len(sys.Exps) == 0 || sys.N+len(sys.Prods) > certifyWork {
		return nil
	}
	found := every.Search(sys, every.Options{MostBoxes: certifyBoxes, Known: unknowns(append([]*Point{p}, r.Others...))})
	all := EveryResult{}
	all.gather(s, append([]*Point{p}, r.Others...), found)
	r.Others = all.Others
	beyond := all.enclosed[0] == nil // the point is not verified within the scope
	if found.Open > 0 || len(r.Others) > 0 || beyond {
		return nil
	}
	return &Search{Proven: true, Scope: scope, Boxes: found.Boxes, Signs: p.Evidence.Determinant, Leaks: leaks(p.Circuit)}
}
