package choose

import (
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/optimize"

	"biaswright/netlist/quantity"
)

// A Pair is two resistors that stand for one, in ohms, the larger first.
type Pair struct {
	A, B     float64
	Parallel bool
}

// Ohms is what the two make together.
func (p *Pair) Ohms() float64 {
	if p.Parallel {
		return p.A * (p.B / (p.A + p.B))
	}
	return p.A + p.B
}

// pairs adds combinations with pairs to the short list. It gives the values whose worst
// deviation is least, in ohms.
func (a *Answer) pairs(t *trial, best *short) (ideal []float64) {
	s := &seeker{t: t, unknowns: a.Unknowns, ohms: make([]float64, len(a.Unknowns))}
	ideal = s.take(s.ideal(a.Exact.Ohms))
	// So many pairs for each value keep their combinations below a few thousand.
	most := []int{0, 60, 20, 8, 4}
	each := 2
	if n := len(a.Unknowns); n < len(most) {
		each = most[n]
	}
	values := make([][]*Pair, len(a.Unknowns))
	for i := range a.Unknowns {
		values[i] = near(a.Unknowns[i].Series, ideal[i], each)
	}
	count := make([]int, len(values))
	k := key{at: a.Combinations}
	for {
		ohms, pairs := make([]float64, len(count)), make([]*Pair, len(count))
		k.away, k.pairs = 0, 0
		for i, n := range count {
			p := values[i][n]
			ohms[i] = p.Ohms()
			if p.B != 0 {
				pairs[i] = p
				k.pairs++
			}
			d := math.Log(ohms[i] / a.Unknowns[i].Exact)
			k.away += d * d
		}
		k.at++
		if k.pairs > 0 { // else the grid has it
			limit := best.limit()
			if judged := t.judge(ohms, k, limit); judged.less(limit) {
				best.add(entry{judged, ohms, pairs})
			}
		}
		if !next(count, func(i int) int { return len(values[i]) }) {
			return ideal
		}
	}
}

// ideal looks for the values, as ln R, whose worst deviation is least, by a simplex
// search from the exact ones and within a decade of them.
func (s *seeker) ideal(ohms []float64) []float64 {
	u := make([]float64, len(ohms))
	for i, v := range ohms {
		u[i] = math.Log(v)
	}
	exact := slices.Clone(u)
	best, bestKey := u, worstKey
	problem := optimize.Problem{Func: func(u []float64) float64 {
		inside, beyond := make([]float64, len(u)), 0.0
		for i, v := range u {
			inside[i] = math.Max(exact[i]-math.Ln10, math.Min(exact[i]+math.Ln10, v))
			beyond += math.Abs(v - inside[i])
		}
		k := s.t.judge(s.take(inside), key{}, worstKey)
		if k.less(bestKey) {
			best, bestKey = inside, k
		}
		// What is missed counts more than any deviation within the bands, and what a hold
		// misses less than the rest.
		const burnt, off, missed, lost, nowhere = 1e13, 5e12, 1e6, 1e3, 1e5
		f := math.Min(k.score, nowhere) + missed*math.Min(k.miss, nowhere) + lost*math.Min(k.lost, nowhere) + beyond
		if k.burnt {
			f += burnt
		}
		if k.off {
			f += off
		}
		return f
	}}
	const step = 0.05 // e-folds: half of what E24's values lie apart
	_, _ = optimize.Minimize(problem, u, &optimize.Settings{
		Converger: &optimize.FunctionConverge{Absolute: 1e-6, Iterations: 30}, MajorIterations: 300,
	}, &optimize.NelderMead{SimplexSize: step})
	return best
}

// near lists so many ways to make up a resistance from one or two values of a series,
// the nearest by ratio first, with at least one single value among them, a pair whose B
// is 0. Of two, the larger is at most a hundred times the other: one further off acts by
// less than a tolerance.
func near(series string, ohms float64, most int) []*Pair {
	const (
		widest = 100
		slack  = 2 // in a coarse series the nearest pair may be that far off
	)
	s, _ := quantity.Series(series)
	below, above := s.Neighbours(ohms)
	out := []*Pair{{A: below}, {A: above}}
	for _, a := range preferred(series, ohms/2/slack, ohms*slack) { // the larger of two in series
		for _, b := range preferred(series, a/widest, a) {
			out = append(out, &Pair{A: a, B: b})
		}
	}
	for _, b := range preferred(series, ohms/slack, 2*ohms*slack) { // the smaller of two in parallel
		for _, a := range preferred(series, b, widest*b) {
			out = append(out, &Pair{A: a, B: b, Parallel: true})
		}
	}
	off := func(p *Pair) float64 { return math.Abs(math.Log(p.Ohms() / ohms)) }
	sort.SliceStable(out, func(i, j int) bool { return off(out[i]) < off(out[j]) })
	single := func(p *Pair) bool { return p.B == 0 }
	kept := out[:min(most, len(out))]
	if !slices.ContainsFunc(kept, single) {
		kept = append(slices.Clip(kept), out[slices.IndexFunc(out, single)])
	}
	return kept
}

// Pair is the two resistors that make up a value; nil for one.
func (c *Choice) Pair(unknown int) *Pair {
	if c.Pairs == nil {
		return nil
	}
	return c.Pairs[unknown]
}
