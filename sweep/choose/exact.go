package choose

import (
	"fmt"
	"math"
	"math/big"
	"slices"
	"sort"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/optimize"

	"biaswright/solve"
)

// LeastOhms and MostOhms are the range in which resistances are looked for, in ohms: that
// of ordinary parts (common practice); leastEver and mostEver are how far the search itself
// may stray.
const (
	LeastOhms, MostOhms = 0.1, 10e6
	leastEver, mostEver = 0.01, 1e9
)

// unremarkable in ohms is what a value is nearest to where nothing decides: the middle
// of the range, and a usual size of a bias resistor.
const unremarkable = 1e3

// A place is a set of values, u = ln R by unknown, with the targets' deviations there
// in units of their bands.
type place struct {
	u     []float64
	f     []float64 // by target
	x     []float64 // the solution
	unmet int       // keeps, at the nominal point
	merit float64
	away  float64
}

// A seeker looks for the exact values.
type seeker struct {
	t        *trial
	unknowns []Unknown
	ohms     []float64
}

// exact finds the values at which the targets are met, in ohms.
func (a *Answer) exact(t *trial) ([]float64, error) {
	s := &seeker{t: t, unknowns: a.Unknowns, ohms: make([]float64, len(a.Unknowns))}
	targets := len(t.c.Targets)
	switch n := len(a.Unknowns); {
	case n > targets:
		a.Fit = Free
	case n < targets:
		a.Fit = Compromise
	default:
		a.Fit = Fixed
	}
	seen := s.scan()
	if len(seen) == 0 {
		return nil, s.noPoint()
	}
	starts := s.starts(seen)
	if err := s.felt(seen, starts); err != nil {
		return nil, err
	}
	var found []*place
	if a.Fit != Compromise {
		found = s.solutions(starts, seen)
	}
	if len(found) == 0 {
		p := s.nearest(starts)
		if a.Fit != Compromise {
			if q, ok := s.newton(p, nil); ok {
				return s.take(q.u), nil
			}
			a.Fit = Nearest
		}
		return s.take(p.u), nil
	}
	return s.take(s.pick(found).u), nil
}

// take is a copy of u in ohms.
func (s *seeker) take(u []float64) []float64 {
	out := make([]float64, len(u))
	for i, v := range u {
		out[i] = math.Exp(v)
	}
	return out
}

// noPoint tells why no values gave an operating point.
func (s *seeker) noPoint() error {
	if _, err := solve.Solve(s.t.c, solve.Options{Near: s.t.nominal.how.near}); err != nil {
		return err
	}
	return &solve.Failure{Says: fmt.Sprintf("no operating point found with resistances from %g to %g ohm", LeastOhms, float64(MostOhms))}
}

// from makes the next evaluation start from a place's solution, and so on its branch.
func (s *seeker) from(p *place) {
	b := s.t.nominal
	copy(b.x, p.x)
	b.s.From(b.x)
	b.warm = true
}

// at evaluates the targets; nil where there is no operating point or no number.
func (s *seeker) at(u []float64) *place {
	for i, v := range u {
		s.ohms[i] = math.Exp(v)
	}
	if !s.t.nominal.at(s.ohms) {
		return nil
	}
	p := &place{u: slices.Clone(u), f: make([]float64, len(s.t.c.Targets)), x: slices.Clone(s.t.nominal.x)}
	for _, v := range solve.JudgeAt(s.t.c, s.t.nominal.state, nil) {
		if v.Kind == "keep" {
			if !v.Met {
				p.unmet++
			}
			continue
		}
		f := (2*v.Value - v.Low - v.High) / (v.High - v.Low)
		if math.IsNaN(f) || math.IsInf(f, 0) {
			return nil
		}
		p.f[v.Index] = f
		l := math.Log1p(math.Abs(f)) // far away, decades count and not differences
		p.merit += l * l
	}
	for i, v := range u {
		from := s.unknowns[i].stated
		if !(from > 0) {
			from = unremarkable
		}
		d := v - math.Log(from)
		p.away += d * d
	}
	return p
}

// slopes is df/du at the last place evaluated: targets by unknowns.
func (s *seeker) slopes() (*mat.Dense, bool) {
	c := s.t.c
	j := mat.NewDense(len(c.Targets), len(s.unknowns), nil)
	for row := range c.Targets {
		t := &c.Targets[row]
		_, d, err := s.t.nominal.state.Sensitivity(t.Q)
		if err != nil {
			return nil, false
		}
		low, high := t.Band()
		width := (high - low) / 2
		for col := range s.unknowns {
			g := d[s.unknowns[col].slot] * s.ohms[col] / width
			if math.IsNaN(g) || math.IsInf(g, 0) {
				return nil, false
			}
			j.Set(row, col, g)
		}
	}
	return j, true
}

// scan evaluates a coarse grid of equal ratios, and the stated values of what was
// reopened. For more unknowns than three a grid would be too coarse: then as many places
// are spread evenly over the usual sizes.
func (s *seeker) scan() []*place {
	const (
		most  = 600 // places, some milliseconds
		dense = 65  // eight a decade: two solutions of one value lie further apart
		three = 3
	)
	var out []*place
	look := func(u []float64) {
		if s.t.nominal.how.ladder { // a neighbour may stand on the branch that is not wanted
			s.t.nominal.warm = false
		}
		if p := s.at(u); p != nil {
			out = append(out, p)
		}
	}
	n := len(s.unknowns)
	if n > three {
		s.spread(most, look)
	} else {
		per := min(dense, int(math.Pow(most, 1/float64(n))))
		low, high := math.Log(LeastOhms), math.Log(MostOhms)
		u, count := make([]float64, n), make([]int, n)
		for more := true; more; more = next(count, func(int) int { return per }) {
			for i := range u {
				u[i] = low + (high-low)*float64(count[i])/float64(per-1)
			}
			look(u)
		}
	}
	stated := make([]float64, n)
	for i := range s.unknowns {
		if stated[i] = math.Log(s.unknowns[i].stated); math.IsNaN(stated[i]) {
			stated[i] = math.Log(unremarkable)
		}
	}
	look(stated)
	return out
}

// spread looks at so many places over the usual sizes of bias resistors, evenly in every
// direction: by the fractions of multiples of the square roots of primes (R. D. Richtmyer's
// sequence; from memory).
func (s *seeker) spread(places int, look func(u []float64)) {
	const low, high = 10, 1e6 // ohm; common practice
	u := make([]float64, len(s.unknowns))
	var root []float64
	for p := 2; len(root) < len(u); p++ {
		if big.NewInt(int64(p)).ProbablyPrime(0) { // exact for numbers as small
			root = append(root, math.Sqrt(float64(p)))
		}
	}
	for k := range places {
		for i := range u {
			_, fraction := math.Modf(float64(k+1) * root[i])
			u[i] = math.Log(low) + fraction*math.Log(high/low)
		}
		look(u)
	}
}

// next counts on, the last digit first; false after the last.
func next(count []int, base func(i int) int) bool {
	for i := len(count) - 1; i >= 0; i-- {
		if count[i]++; count[i] < base(i) {
			return true
		}
		count[i] = 0
	}
	return false
}

// felt looks for an unknown that no target feels.
func (s *seeker) felt(seen, starts []*place) error {
	const (
		looks = 32   // places looked at, beside the starts
		faint = 1e-6 // bands an e-fold; over the whole range that moves nothing
	)
	strongest := make([]float64, len(s.unknowns))
	look := func(p *place) {
		s.from(p)
		if s.at(p.u) == nil {
			return
		}
		j, ok := s.slopes()
		for row := 0; ok && row < len(p.f); row++ {
			for col := range strongest {
				strongest[col] = math.Max(strongest[col], math.Abs(j.At(row, col)))
			}
		}
	}
	for i := 0; i < len(seen); i += len(seen)/looks + 1 {
		look(seen[i])
	}
	for _, p := range starts {
		look(p)
	}
	for i, g := range strongest {
		if g < faint {
			u := &s.unknowns[i]
			return wrong("unfelt", s.t.c.Elements[u.Element].Span, "state a target for what it decides, or give it a value: --set "+u.Name+"=1k",
				"no target feels %s: whatever its value, %s the same", u.Name, targetsStay(s.t.c.Targets[0].Q.Text, len(s.t.c.Targets)))
		}
	}
	return nil
}

func targetsStay(first string, n int) string {
	if n == 1 {
		return first + " stays"
	}
	return fmt.Sprintf("%s and the other targets stay", first)
}

// starts are the places to go on from: those with the least deviations, and of the
// better ones those that keep what is to be kept and are least remarkable.
func (s *seeker) starts(seen []*place) []*place {
	const (
		each   = 12
		better = 20 // one in so many
	)
	order := slices.Clone(seen)
	sort.SliceStable(order, func(i, j int) bool {
		a, b := order[i], order[j]
		const same = 1e-9
		if math.Abs(a.merit-b.merit) > same*(a.merit+b.merit) {
			return a.merit < b.merit
		}
		return a.away < b.away
	})
	out := slices.Clone(order[:min(each, len(order))])
	good := order[:max(len(out), len(order)/better)]
	sort.SliceStable(good, func(i, j int) bool {
		a, b := good[i], good[j]
		if a.unmet != b.unmet {
			return a.unmet < b.unmet
		}
		return a.away < b.away
	})
	return append(out, good[:min(each, len(good))]...)
}

// solutions are the different sets of values at which every target is met.
func (s *seeker) solutions(starts, seen []*place) []*place {
	var found []*place
	add := func(p *place) {
		const same = 1e-6
		if !slices.ContainsFunc(found, func(q *place) bool { return furthest(p.u, q.u) < same }) {
			found = append(found, p)
		}
	}
	if len(s.unknowns) == 1 && len(s.t.c.Targets) == 1 {
		if found = s.bracketed(seen); len(found) > 0 {
			return found
		}
	}
	for _, from := range starts {
		if p, ok := s.newton(from, nil); ok {
			add(p)
		}
	}
	const few = 3 // walks are dear, and from neighbours alike
	for i := 0; len(found) == 0 && i < min(few, len(starts)); i++ {
		if p, ok := s.walk(starts[i]); ok {
			add(p)
		}
	}
	return found
}

// bracketed are the solutions of one target in one value between neighbours of the
// scan on either side of it.
func (s *seeker) bracketed(seen []*place) []*place {
	order := slices.Clone(seen)
	sort.SliceStable(order, func(i, j int) bool { return order[i].u[0] < order[j].u[0] })
	var out []*place
	for i := 1; i < len(order); i++ {
		a, b := order[i-1], order[i]
		if (a.f[0] < 0) == (b.f[0] < 0) {
			continue
		}
		const halvings = 60 // to the last digit
		for range halvings {
			s.from(a)
			m := s.at([]float64{(a.u[0] + b.u[0]) / 2})
			if m == nil {
				break
			}
			if (m.f[0] < 0) == (a.f[0] < 0) {
				a = m
			} else {
				b = m
			}
		}
		if math.Abs(b.f[0]) < math.Abs(a.f[0]) {
			a = b
		}
		if math.Abs(a.f[0]) < met { // not a jump from one branch to another
			out = append(out, a)
		}
	}
	return out
}

// met in bands is a target met exactly.
const met = 1e-9

// newton goes from u to where f = goal (nil for 0) by damped steps of the least length
// in ln R. It gives the last place, and whether the goal is met there; nil where
// it could not even begin.
func (s *seeker) newton(from *place, goal []float64) (*place, bool) {
	const (
		steps   = 40
		longest = 1.5  // e-folds; beyond it no linear model means much
		least   = 1e-3 // fraction of a step
		settled = 1e-11
	)
	s.from(from)
	p := s.at(from.u)
	if p == nil {
		return nil, false
	}
	for range steps {
		j, ok := s.slopes()
		if !ok {
			return p, false
		}
		r := residual(p.f, goal)
		du, ok := shortest(j, r)
		if !ok {
			return p, false
		}
		size := furthest(du, make([]float64, len(du)))
		if size < settled && norm(r) < met {
			return p, true
		}
		fraction := math.Min(1, longest/size)
		var q *place
		for ; fraction > least; fraction /= 2 {
			trial := make([]float64, len(du))
			for i := range trial {
				trial[i] = within(p.u[i] + fraction*du[i])
			}
			s.from(p)
			q = s.at(trial)
			if q != nil && (norm(residual(q.f, goal)) < (1-fraction/4)*norm(r) || norm(r) < met) {
				break
			}
			q = nil
		}
		if q == nil {
			return p, norm(r) < met
		}
		p = q
	}
	return p, norm(residual(p.f, goal)) < met
}

// walk leads the targets from what they are at a place to what they shall be, by
// steps that shrink where Newton fails: continuation.
func (s *seeker) walk(from *place) (*place, bool) {
	const least = 1e-3 // of the way
	goal := make([]float64, len(from.f))
	p := from
	for at, step := 0.0, 0.25; at < 1; {
		to := math.Min(1, at+step)
		for i, f := range from.f {
			goal[i] = (1 - to) * f
		}
		q, ok := s.newton(p, goal)
		if ok {
			p, at = q, to
			step *= 2
			continue
		}
		if step /= 2; step < least {
			return nil, false
		}
	}
	return p, true
}

func residual(f, goal []float64) []float64 {
	r := slices.Clone(f)
	for i := range goal {
		r[i] -= goal[i]
	}
	return r
}

// within keeps ln R in the range that the search may stray to.
func within(u float64) float64 {
	return math.Max(math.Log(leastEver), math.Min(math.Log(mostEver), u))
}

// shortest is the shortest du with J du = -f in the sense of least squares, by the
// singular values; directions that hardly act are left alone.
func shortest(j *mat.Dense, f []float64) ([]float64, bool) {
	var svd mat.SVD
	if !svd.Factorize(j, mat.SVDThin) {
		return nil, false
	}
	const rcond = 1e-9 // against the largest; below it a direction is rounding
	rank := svd.Rank(rcond)
	if rank == 0 {
		return nil, false
	}
	b := mat.NewVecDense(len(f), nil)
	b.ScaleVec(-1, mat.NewVecDense(len(f), f))
	var x mat.VecDense
	svd.SolveVecTo(&x, b, rank)
	out := make([]float64, x.Len())
	for i := range out {
		if out[i] = x.AtVec(i); math.IsNaN(out[i]) || math.IsInf(out[i], 0) {
			return nil, false
		}
	}
	return out, true
}

// nearest is where the largest deviation is least. Least squares lead near it; from
// there a simplex search, which needs no derivatives: a largest of several has not one
// everywhere. Of places that are as good it takes the least remarkable.
func (s *seeker) nearest(starts []*place) *place {
	var best *place
	for _, from := range starts {
		p, _ := s.newton(from, nil)
		if p == nil {
			p = from
		}
		const close = 1.01 // times the least deviation is as good
		switch {
		case best == nil || norm(p.f)*close < norm(best.f):
			best = p
		case norm(p.f) < norm(best.f)*close && p.away < best.away:
			best = p
		}
	}
	problem := optimize.Problem{Func: func(u []float64) float64 {
		inside, beyond := make([]float64, len(u)), 0.0
		for i, v := range u {
			inside[i] = math.Max(math.Log(LeastOhms), math.Min(math.Log(MostOhms), v))
			beyond += math.Abs(v - inside[i])
		}
		s.from(best)
		p := s.at(inside)
		if p == nil {
			const nowhere = 1e9 // bands; above any deviation that is met
			return nowhere
		}
		if norm(p.f) < norm(best.f) {
			best = p
		}
		return norm(p.f) + beyond
	}}
	const step = 0.2 // e-folds, a neighbour in the scan
	// The best place seen counts, however the search ends.
	_, _ = optimize.Minimize(problem, slices.Clone(best.u), &optimize.Settings{
		Converger: &optimize.FunctionConverge{Absolute: met, Iterations: 100},
	}, &optimize.NelderMead{SimplexSize: step})
	return best
}

// pick chooses among several solutions: one that exceeds no rating, then one at which all
// is met everywhere, then the one at which fewest keeps fail nominally, then the one
// nearest to the values stated or to unremarkable ones. What deviates least is left to
// the grid: without need it leads to extremes.
func (s *seeker) pick(found []*place) *place {
	rank := func(p *place) (burnt, missed bool) {
		s.from(p)
		k := s.t.judge(s.take(p.u), key{}, worstKey)
		return k.burnt, !k.whole()
	}
	best := found[0]
	burnt, missed := rank(best)
	for _, p := range found[1:] {
		b, m := rank(p)
		better := p.away < best.away
		switch {
		case b != burnt:
			better = burnt
		case m != missed:
			better = missed
		case p.unmet != best.unmet:
			better = p.unmet < best.unmet
		}
		if better {
			best, burnt, missed = p, b, m
		}
	}
	return best
}

// norm is the largest magnitude.
func norm(v []float64) float64 {
	m := 0.0
	for _, e := range v {
		m = math.Max(m, math.Abs(e))
	}
	return m
}

func furthest(a, b []float64) float64 {
	m := 0.0
	for i := range a {
		m = math.Max(m, math.Abs(a[i]-b[i]))
	}
	return m
}
