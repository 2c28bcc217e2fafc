package choose

import (
	"errors"
	"math"
	"slices"
	"sort"

	"biaswright/solve"
)

// An entry is a combination with its key.
type entry struct {
	key
	ohms  []float64
	pairs []*Pair // nil where every value is one resistor
}

// A short is the best so many entries, the best first.
type short struct {
	most    int
	entries []entry
}

// limit is the key that a combination must come before.
func (l *short) limit() key {
	if len(l.entries) < l.most {
		return worstKey
	}
	return l.entries[l.most-1].key
}

func (l *short) add(e entry) {
	if slices.ContainsFunc(l.entries, func(o entry) bool { return o.at == e.at }) {
		return
	}
	at := sort.Search(len(l.entries), func(i int) bool { return e.key.less(l.entries[i].key) })
	e.ohms, e.pairs = slices.Clone(e.ohms), slices.Clone(e.pairs)
	l.entries = slices.Insert(l.entries, at, e)
	l.entries = l.entries[:min(len(l.entries), l.most)]
}

// A searcher tries combinations on a trial of its own.
type searcher struct {
	a    *Answer
	t    *trial
	best short
	ohms []float64
}

// search tries the whole grid and fills in the choices.
func (a *Answer) search(o Options) error {
	workers := max(1, min(o.Workers, len(a.Unknowns[0].grid)))
	all := make([]*searcher, workers)
	for i := range all {
		t, err := newTrial(a.Circuit, a.Unknowns, a.how)
		if err != nil {
			return err
		}
		all[i] = &searcher{a: a, t: t, best: short{most: o.List}, ohms: make([]float64, len(a.Unknowns))}
	}
	// The neighbours of the exact values first: what is best is mostly among them, and
	// bounds all that follows.
	all[0].neighbours()
	for _, s := range all[1:] {
		s.best.entries = slices.Clone(all[0].best.entries)
	}
	rows := len(a.Unknowns[0].grid)
	todo, done := make(chan int, rows), make(chan int, rows)
	for row := range rows {
		todo <- row
	}
	close(todo)
	for _, s := range all {
		go func() {
			for row := range todo {
				s.row(row)
				done <- row
			}
		}()
	}
	for row := range rows {
		<-done
		if o.Progress != nil {
			o.Progress(a.Combinations/rows*(row+1), a.Combinations)
		}
	}
	best := all[0].best
	for _, s := range all[1:] {
		for _, e := range s.best.entries {
			best.add(e)
		}
	}
	if err := a.list(&best); err != nil || !o.Pair || a.Choices[0].Met() {
		return err
	}
	ideal, err := a.detail(a.pairs(all[0].t, &best))
	if err != nil {
		return err
	}
	a.Ideal = &ideal
	return a.list(&best)
}

// list fills in the choices, without those that have no operating point.
func (a *Answer) list(best *short) error {
	a.Choices = nil
	var none *solve.Failure
	for _, e := range best.entries {
		c, err := a.detail(e.ohms)
		switch {
		case errors.As(err, &none):
			continue
		case err != nil:
			return err
		}
		c.Pairs = e.pairs
		a.Choices = append(a.Choices, c)
	}
	if len(a.Choices) == 0 {
		return none
	}
	return nil
}

// neighbours tries the values next to the exact ones.
func (s *searcher) neighbours() {
	const most = 6 // of 3^6 combinations; further unknowns stay at their nearest
	low, span := make([]int, len(s.a.Unknowns)), make([]int, len(s.a.Unknowns))
	for i := range s.a.Unknowns {
		u := &s.a.Unknowns[i]
		at := nearestAt(u.grid, u.Exact)
		low[i], span[i] = at, 1
		if i < most {
			low[i] = max(0, at-1)
			span[i] = min(len(u.grid), at+2) - low[i]
		}
	}
	step, count := make([]int, len(low)), make([]int, len(low))
	for {
		for i := range count {
			count[i] = low[i] + step[i]
		}
		s.try(count)
		if !next(step, func(i int) int { return span[i] }) {
			return
		}
	}
}

// nearestAt is the place of the value nearest by ratio.
func nearestAt(grid []float64, v float64) int {
	best := 0
	for i, g := range grid {
		if math.Abs(math.Log(g/v)) < math.Abs(math.Log(grid[best]/v)) {
			best = i
		}
	}
	return best
}

// row tries all combinations with the first unknown at one value.
func (s *searcher) row(first int) {
	count := make([]int, len(s.a.Unknowns))
	count[0] = first
	rest := count[1:]
	for {
		s.try(count)
		if !next(rest, func(i int) int { return len(s.a.Unknowns[i+1].grid) }) {
			return
		}
	}
}

// try judges a combination as far as is needed to know that it is not among the best.
func (s *searcher) try(count []int) {
	k := key{}
	for i, n := range count {
		u := &s.a.Unknowns[i]
		s.ohms[i] = u.grid[n]
		d := math.Log(u.grid[n] / u.Exact)
		k.away += d * d
		k.at = k.at*len(u.grid) + n
	}
	limit := s.best.limit()
	if k = s.t.judge(s.ohms, k, limit); k.less(limit) {
		s.best.add(entry{k, s.ohms, nil})
	}
}

// detail judges values from the beginning, with all that is known of each requirement.
func (a *Answer) detail(ohms []float64) (Choice, error) {
	c, err := withValues(a.Circuit, a.Unknowns, ohms)
	if err != nil {
		return Choice{}, err
	}
	t, err := newTrial(c, a.Unknowns, a.how)
	if err != nil {
		return Choice{}, err
	}
	out := Choice{Ohms: ohms}
	if !t.nominal.at(ohms) {
		_, err := solve.Solve(c, solve.Options{Near: a.how.near})
		if err == nil {
			err = &solve.Failure{Says: "no stable operating point was found"}
		}
		return Choice{}, err
	}
	out.Nominal = solve.PointAt(t.nominal.s, t.nominal.x, "cold")
	y := &t.tally
	y.begin(len(t.requirements), key{})
	t.visit(ohms, t.order, func(_ int, g sight) bool {
		y.add(g)
		if g.failed && out.Failed == nil {
			out.Failed = &g.ends
		}
		for i, v := range g.verdicts {
			switch {
			case i == len(out.Requirements):
				out.Requirements = append(out.Requirements, Requirement{Nominal: v, Worst: v})
			case worse(&v, &out.Requirements[i].Worst):
				out.Requirements[i].Worst, out.Requirements[i].At = v, g.ends
			}
		}
		for _, x := range g.exceeded {
			out.exceed(x, g.ends)
		}
		return true
	})
	out.Unmet, out.Miss, out.Score = y.unmet, math.Max(y.miss, y.lost), y.score
	for i := range out.Requirements {
		out.Requirements[i].Worst.Met = y.met[i]
	}
	for _, r := range out.Nominal.Rails {
		out.Draw += r.Delivers()
	}
	return out, nil
}

// worse compares margins; one without a number is worst.
func worse(a, b *solve.Verdict) bool {
	if math.IsNaN(b.Margin) {
		return false
	}
	return math.IsNaN(a.Margin) || a.Margin < b.Margin
}

// exceed notes a rating that is exceeded, where it is so by most.
func (c *Choice) exceed(x solve.Caution, ends []End) {
	at := slices.IndexFunc(c.Ratings, func(r Rating) bool { return r.Subject == x.Subject && r.Rating == x.Rating })
	switch {
	case at < 0:
		c.Ratings = append(c.Ratings, Rating{x, ends})
	case x.Value > c.Ratings[at].Value:
		c.Ratings[at] = Rating{x, ends}
	}
}
