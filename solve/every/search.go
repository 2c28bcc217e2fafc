package every

import (
	"math"
	"sync"
	"time"

	"biaswright/solve/interval"
)

// Options steer a search.
type Options struct {
	// Budget ends the search, and so does MostBoxes; 0 is none. RootOnly never splits.
	Budget    time.Duration
	MostBoxes int
	RootOnly  bool
	// Known are solutions, as doubles, that the search may begin with.
	Known [][]float64
	// Workers is how many boxes are looked at at a time; 0 is one. The answer is the
	// same, unless the budget ends it.
	Workers int
	// Check, where set, is given every box before and after each step that narrows it,
	// as Point's Coordinates has them; after is nil where the step found it empty. It is
	// for tests.
	Check func(step string, before, after []interval.I)
}

// A Result is what a search found.
type Result struct {
	// Points are all solutions found, each verified, in an order that does not depend
	// on Workers.
	Points []*Point
	// Boxes counts those looked at; Open those that remain. With none open, Points is
	// complete.
	Boxes, Open int
}

// Search finds all solutions in the System's start box.
func Search(s *System, o Options) *Result {
	f := &finder{s: s, o: o, cols: s.columns(), res: &Result{}}
	f.params = s.params(f.cols)
	if o.Budget > 0 {
		f.deadline = time.Now().Add(o.Budget)
	}
	for _, x := range o.Known {
		if p := s.verify(x, f.params, 0); p != nil {
			f.keep(p)
		}
	}
	f.run()
	return f.res
}

// Away looks for solutions beside those known, by Newton iterations that look away from
// them, from the middle and from near each. It proves nothing of what it does not find.
func Away(s *System, o Options) *Result {
	f := &finder{s: s, o: o, cols: s.columns(), res: &Result{}}
	f.params = s.params(f.cols)
	b := s.start()
	starts := [][]float64{b.middle()}
	for _, x := range o.Known {
		if p := s.verify(x, f.params, 0); p != nil {
			f.keep(p)
			starts = append(starts, x)
		}
	}
	for i := 0; i < len(starts); i++ {
		for range 2 * s.N { // each success may hide another
			var away [][]float64
			for _, p := range f.res.Points {
				away = append(away, (&box{x: p.X}).middle())
			}
			from := append([]float64(nil), starts[i]...)
			const aside = 1e-3 // V: on a solution the factor has no slope
			for k := range from {
				from[k] += aside
			}
			x, ok := s.newton(b, from, f.params, away)
			if !ok {
				break
			}
			p := s.verify(x, f.params, 0)
			before := len(f.res.Points)
			if p != nil {
				f.keep(p)
			}
			if len(f.res.Points) == before {
				break
			}
			starts = append(starts, x)
		}
	}
	return f.res
}

type finder struct {
	s        *System
	o        Options
	cols     columns
	params   []param
	res      *Result
	deadline time.Time
}

// keep adds a point unless it is one that is there: then it lies where that one is proven
// to be alone. One that surely lies outside the start box is none of the scope's, and the
// result must not claim it.
func (f *finder) keep(p *Point) {
	if f.s.start().beyond(p) {
		return
	}
	for _, q := range f.res.Points {
		switch {
		case !meets(p.X, q.X):
		case within(p.X, q.only) || within(q.X, p.only):
			return
		default: // too near to be told apart in doubles
			f.res.Open++
			return
		}
	}
	f.res.Points = append(f.res.Points, p)
}

// within tells whether a lies in b.
func within(a, b []interval.I) bool {
	for i := range a {
		if a[i].Lo < b[i].Lo || a[i].Hi > b[i].Hi {
			return false
		}
	}
	return true
}

// beyond tells that a point surely lies outside a box.
func (b *box) beyond(p *Point) bool { return !meets(b.x, p.X) || !meets(b.u, p.u) }

func meets(a, b []interval.I) bool {
	for i := range a {
		if a[i].Meet(b[i]).Empty() {
			return false
		}
	}
	return true
}

// wave is how many boxes are looked at before what they found is put together: few, so
// that a point that is found helps soon.
const wave = 8

// run works through the boxes, the last ones first, a few at a time.
func (f *finder) run() {
	open := []*box{f.s.start()}
	for _, x := range open[0].x {
		if x.Empty() {
			return
		}
	}
	for len(open) > 0 {
		spent := f.o.MostBoxes > 0 && f.res.Boxes >= f.o.MostBoxes
		if spent || !f.deadline.IsZero() && time.Now().After(f.deadline) {
			f.res.Open += len(open)
			return
		}
		n := min(wave, len(open))
		taken := open[len(open)-n:]
		open = open[:len(open)-n]
		looks := f.together(taken)
		f.res.Boxes += n
		for _, l := range looks {
			for _, p := range l.found {
				f.keep(p)
			}
			open = append(open, l.parts...)
			if l.stuck {
				f.res.Open++
			}
		}
	}
}

// A look is what came of one box.
type look struct {
	found []*Point
	parts []*box // still to be looked at
	stuck bool   // too small to be split, and not settled
}

// together looks at boxes side by side, all with the points known before.
func (f *finder) together(boxes []*box) []look {
	out := make([]look, len(boxes))
	if f.o.Workers < 2 || len(boxes) == 1 {
		for i, b := range boxes {
			out[i] = f.look(b)
		}
		return out
	}
	var wait sync.WaitGroup
	slots := make(chan struct{}, f.o.Workers)
	for i, b := range boxes {
		slots <- struct{}{}
		wait.Add(1)
		go func() {
			defer wait.Done()
			out[i] = f.look(b)
			<-slots
		}()
	}
	wait.Wait()
	return out
}

// look settles a box, or splits it.
func (f *finder) look(b *box) (out look) {
	s := f.s
	p := newPropagator(s)
	var l *linearised
	const rounds = 40
	for round := range rounds {
		before := f.coordinates(b)
		if !p.run(b) {
			f.check("propagate", before, nil)
			return out
		}
		f.check("propagate", before, b)
		// The test is dear: it is made at rounds 0, 1, 2, 4, 8 and so on, and at last.
		if round&(round-1) == 0 && f.settled(b, &out, round == 0) {
			return out
		}
		var ok bool
		if l, ok = s.linearise(b, f.cols); !ok {
			l = nil
			break
		}
		before = f.coordinates(b)
		alive, moved := l.narrow(s, b)
		if !alive {
			f.check("chords", before, nil)
			return out
		}
		f.check("chords", before, b)
		if !moved {
			break
		}
	}
	if !p.run(b) || f.settled(b, &out, true) {
		return out
	}
	if f.o.RootOnly {
		out.stuck = true
		return out
	}
	k, at := f.cut(b, l)
	if k < 0 {
		out.stuck = true
		return out
	}
	low, high := b, b.clone()
	low.u[k].Hi, high.u[k].Lo = at, at
	out.parts = []*box{low, high}
	return out
}

// coordinates are a copy of a box, for a check.
func (f *finder) coordinates(b *box) []interval.I {
	if f.o.Check == nil || b == nil {
		return nil
	}
	return append(append([]interval.I(nil), b.x...), b.u...)
}

func (f *finder) check(step string, before []interval.I, after *box) {
	if f.o.Check != nil {
		f.o.Check(step, before, f.coordinates(after))
	}
}

// settled tells whether a box holds no solution beside the known ones. Where it is to look,
// and none that is known lies in the box, it looks for one that would settle it.
func (f *finder) settled(b *box, out *look, looking bool) bool {
	if f.s.Monotone && len(f.res.Points) > 0 {
		return true
	}
	for i := range b.u { // slopes need ends
		if math.IsInf(b.u[i].Hi, 0) {
			return false
		}
	}
	for _, p := range f.res.Points {
		if f.s.alone(b.u, f.cols, p) {
			return true
		}
	}
	for _, p := range out.found {
		if f.s.alone(b.u, f.cols, p) {
			return true
		}
	}
	if len(out.found) > 0 || !looking || f.holds(b) {
		return false
	}
	x, ok := f.s.newton(b, b.middle(), f.params, nil)
	if !ok {
		return false
	}
	p := f.s.verify(x, f.params, 0)
	if p == nil {
		return false
	}
	for _, q := range f.res.Points {
		if meets(p.X, q.X) {
			return false
		}
	}
	out.found = append(out.found, p)
	return f.s.alone(b.u, f.cols, p)
}

// holds tells whether a known point lies in a box.
func (f *finder) holds(b *box) bool {
	for _, p := range f.res.Points {
		if b.has(f.s, p.X) {
			return true
		}
	}
	return false
}

// cut chooses an exponential whose argument to split, and where: that whose remainder moves
// the unknowns most, where it is largest; -1 where nothing is wide enough to be split.
func (f *finder) cut(b *box, l *linearised) (k int, at float64) {
	k, most := -1, 0.0
	for i := range f.s.Exps {
		w := b.u[i].Width()
		// An exponential is straight to a part in 10^12 over a millionth of Phi: there
		// is nothing left to split.
		least := 1e-6 * f.s.Exps[i].Phi
		if !(w > least) {
			continue
		}
		score := math.Min(w, 1e9) / f.s.Exps[i].Phi
		if l != nil {
			score = l.influence(i)
		}
		if score > most {
			k, most = i, score
		}
	}
	if k < 0 {
		return -1, 0
	}
	u, e := b.u[k], &f.s.Exps[k]
	at = e.flat(e.chordAt(u.Lo, u.Hi).Mid(), u)
	const edge = 0.1 // of the width: no sliver is cut off
	at = math.Min(math.Max(at, u.Lo+edge*u.Width()), u.Hi-edge*u.Width())
	if math.IsNaN(at) || math.IsInf(at, 0) {
		at = u.Mid()
	}
	for _, p := range f.res.Points { // not through a known point
		if p.u[k].Has(at) {
			at += 0.05 * u.Width()
		}
	}
	return k, at
}
