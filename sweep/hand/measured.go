package hand

import (
	"cmp"
	"math"
	"slices"
	"strings"

	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/solve/mna"
)

// Agreement is how a measured value stands to the model.
type Agreement string

// The agreements.
const (
	// Agrees: within what a hand meter shows, 1 % (common practice).
	Agrees Agreement = "agrees"
	// Reachable: by itself within the stated tolerances of the parts, to first order.
	Reachable Agreement = "within tolerances"
	// Apart: the model, as stated, does not give it.
	Apart Agreement = "apart"
)

// meter is the relative accuracy of a hand meter's DC ranges, common practice.
const meter = 0.01

// A Suspect is a parameter whose change alone would explain measured values.
type Suspect struct {
	Slot netlist.SlotID
	Name string // as settings write it
	// From is its number, To the one it would need, in the slot's unit.
	From, To float64
	// Explained is the share of Σ ((measured - model)/measured)², over all measured
	// values, that goes away.
	Explained float64
	// After is by row what the model then has.
	After []float64
}

// Stated tells whether the suspect's bounds are stated, and whether what it would need
// lies inside them.
func (s *Suspect) Stated(c *netlist.Circuit) (stated, inside bool) {
	b := &c.Slots[s.Slot].Bounds
	return b.Stated, b.Stated && s.To >= b.Low && s.To <= b.High
}

// widths is the suspect's change in units of its tolerance: of the distance to the
// bound on that side, 1 at the bound; where none is stated, of what is usual.
func (s *Suspect) widths(c *netlist.Circuit) float64 {
	width := math.Abs(usual(c, s.Slot) * s.From)
	if b := &c.Slots[s.Slot].Bounds; b.Stated {
		if width = b.High - s.From; s.To < s.From {
			width = s.From - b.Low
		}
	}
	return math.Abs(s.To-s.From) / width // +Inf at a bound that leaves no room
}

// usual is a relative tolerance where none is stated, common practice all: 1 % of a
// bench supply, half of a transistor's gain or a saturation current, 5 % of the rest.
func usual(c *netlist.Circuit, id netlist.SlotID) float64 {
	if isRail(c, id) {
		return 0.01
	}
	_, param, _ := strings.Cut(c.Slots[id].Name, ".")
	if slices.Contains([]string{"Isat", "Irec", "betaF", "betaR", "VA"}, param) {
		return 0.5
	}
	return 0.05
}

// alike is the difference of explained shares that no ranking rests on, and the share
// that is none: a meter's own error makes more.
const alike = 0.02

// tried is how many parameters, best to first order, are solved for exactly.
const tried = 8

// A fit is the least squares problem of the measured values.
type fit struct {
	a    *Answer
	rows []int // those measured
	s    *mna.System
}

// measured judges the measured values, and looks for suspects where one is not what
// the nominal model has.
func (a *Answer) measured() error {
	f := &fit{a: a}
	for i := range a.Rows {
		if r := &a.Rows[i]; r.MeasuredLine != netlist.None && !math.IsNaN(r.Full) {
			f.rows = append(f.rows, i)
		}
	}
	if len(f.rows) == 0 {
		return nil
	}
	slopes := make([][]float64, len(f.rows)) // by measured value, by slot
	apart := false
	for k, i := range f.rows {
		r := &a.Rows[i]
		_, d, err := a.Full.Sensitivity(r.Q)
		if err != nil { // the balances do not determine it: no value moves it by so much
			d = make([]float64, len(a.Circuit.Slots))
		}
		slopes[k] = d
		r.Agreement = a.agreement(r, d)
		apart = apart || r.Agreement != Agrees
	}
	if !apart {
		return nil
	}
	var err error
	if f.s, err = mna.New(a.Circuit); err != nil {
		return err
	}
	a.Suspects = f.suspects(slopes)
	return nil
}

// agreement compares a measured value with the model and its stated tolerances.
func (a *Answer) agreement(r *Row, slope []float64) Agreement {
	slack := meter * math.Abs(r.Measured)
	if math.Abs(r.Measured-r.Full) <= slack {
		return Agrees
	}
	low, high := r.Full, r.Full
	for _, id := range candidates(a.Circuit) {
		s := &a.Circuit.Slots[id]
		if !s.Bounds.Stated || isRail(a.Circuit, id) {
			continue // a rail's range is one of use, and the bench has one voltage
		}
		x, y := slope[id]*(s.Bounds.Low-s.Value), slope[id]*(s.Bounds.High-s.Value)
		low, high = low+math.Min(0, math.Min(x, y)), high+math.Max(0, math.Max(x, y))
	}
	if r.Measured >= low-slack && r.Measured <= high+slack {
		return Reachable
	}
	return Apart
}

func isRail(c *netlist.Circuit, id netlist.SlotID) bool {
	return slices.ContainsFunc(c.Rails, func(r netlist.Rail) bool { return r.Volts == id })
}

// parameters are those of parts that a wrong guess is likely in; the others are
// constants of the material, temperatures and ratings.
var parameters = []string{"Isat", "drop", "n", "Rbulk", "Vz", "nz", "rz", "Vbe", "Veb", "betaF", "betaR", "VA", "Irec"}

// candidates are the numbers that may be wrong: those of rails, elements, given values
// and parts that have a finite number of their own other than 0.
func candidates(c *netlist.Circuit) []netlist.SlotID {
	var out []netlist.SlotID
	seen := map[netlist.SlotID]bool{netlist.None: true}
	add := func(id netlist.SlotID) {
		if seen[id] {
			return
		}
		seen[id] = true
		if v := c.Value(id); !c.Follows(id) && v != 0 && v-v == 0 { // v-v: not infinite, not NaN
			out = append(out, id)
		}
	}
	for i := range c.Rails {
		add(c.Rails[i].Volts)
	}
	for _, id := range c.Givens {
		add(id)
	}
	params := func(k *netlist.Kind, slots []netlist.SlotID) {
		for at := range k.Params {
			if slices.Contains(parameters, k.Params[at].Name) {
				add(slots[at])
			}
		}
	}
	for i := range c.Parts {
		params(c.Parts[i].Kind, c.Parts[i].Params)
	}
	for i := range c.Elements {
		e := &c.Elements[i]
		add(e.Value)
		if e.Part != netlist.None {
			params(c.Parts[e.Part].Kind, e.Params)
		}
	}
	return out
}

// suspects finds the parameters that explain most, the best first: those that explain
// alike by the smaller change in units of their tolerance.
func (f *fit) suspects(slopes [][]float64) []Suspect {
	c := f.a.Circuit
	type guess struct {
		slot      netlist.SlotID
		explained float64
	}
	var guesses []guess
	residual := f.residuals(f.a.Full)
	for _, id := range candidates(c) {
		along := make([]float64, len(f.rows))
		for k := range along {
			along[k] = f.relative(k, slopes[k][id]*c.Value(id))
		}
		if size := dot(along, along); size > 0 {
			rs := dot(residual, along)
			guesses = append(guesses, guess{id, rs * rs / (size * dot(residual, residual))})
		}
	}
	slices.SortStableFunc(guesses, func(x, y guess) int { return cmp.Compare(y.explained, x.explained) })
	var out []Suspect
	for _, g := range guesses[:min(tried, len(guesses))] {
		if s, ok := f.solve(g.slot); ok && s.Explained >= alike && possible(c, &s) {
			out = append(out, s)
		}
	}
	if len(out) == 0 {
		return nil
	}
	most := slices.MaxFunc(out, func(x, y Suspect) int { return cmp.Compare(x.Explained, y.Explained) }).Explained
	group := func(s *Suspect) int {
		if s.Explained >= most-alike {
			return 0
		}
		return 1
	}
	slices.SortStableFunc(out, func(x, y Suspect) int {
		if d := cmp.Compare(group(&x), group(&y)); d != 0 {
			return d
		}
		if group(&x) == 1 {
			return cmp.Compare(y.Explained, x.Explained)
		}
		return cmp.Compare(x.widths(c), y.widths(c))
	})
	return out
}

// possible tells that a suspect would need a number that such a part may have.
func possible(c *netlist.Circuit, s *Suspect) bool {
	of, param, _ := strings.Cut(s.Name, ".")
	kind := ""
	for i := range c.Parts {
		if c.Parts[i].Name == of {
			kind = c.Parts[i].Kind.Name
		}
	}
	for i := range c.Elements {
		if e := &c.Elements[i]; e.Name == of && e.Part != netlist.None {
			kind = c.Parts[e.Part].Kind.Name
		}
	}
	low, high, known := solve.Usual(kind, param)
	return !known || s.To >= low && s.To <= high
}

// relative is a difference of the k-th measured value over that value.
func (f *fit) relative(k int, difference float64) float64 {
	r := &f.a.Rows[f.rows[k]]
	return difference / math.Max(math.Abs(r.Measured), meter*math.Abs(r.Full))
}

// residuals are the measured values' relative distances from a point.
func (f *fit) residuals(e netlist.Env) []float64 {
	out := make([]float64, len(f.rows))
	for k, i := range f.rows {
		value, _ := f.a.Rows[i].Q.Eval(e)
		out[k] = f.relative(k, f.a.Rows[i].Measured-value)
	}
	return out
}

func dot(x, y []float64) float64 {
	sum := 0.0
	for i := range x {
		sum += x[i] * y[i]
	}
	return sum
}

// The iteration by which a suspect's number is found, in the logarithm of its relative
// change.
const (
	fitSteps  = 40
	fitStep   = 0.7   // at a time: a factor of two
	fitRange  = 7     // in all: a factor of a thousand, beyond which it is another part
	fitSmall  = 1e-12 // of a step that ends it
	fitHalves = 20
)

// solve moves one number to where the measured values are met best (Gauss and Newton's
// method, by exact derivatives). It reports false where no change helps.
func (f *fit) solve(id netlist.SlotID) (Suspect, bool) {
	from := f.a.Circuit.Value(id)
	start := dot(f.residuals(f.a.Full), f.residuals(f.a.Full))
	at, by := f.a.Full, start
	t := 0.0
	for range fitSteps {
		residual := f.residuals(at)
		along := make([]float64, len(f.rows))
		for k, i := range f.rows {
			_, d, err := at.Sensitivity(f.a.Rows[i].Q)
			if err != nil {
				return Suspect{}, false
			}
			along[k] = f.relative(k, d[id]*from*math.Exp(t))
		}
		size := dot(along, along)
		if size == 0 {
			break
		}
		step := math.Max(-fitStep, math.Min(fitStep, dot(residual, along)/size))
		if math.Abs(t+step) > fitRange || math.Abs(step) < fitSmall {
			break
		}
		next, better := f.toward(id, from, t, &step, by)
		if next == nil {
			break
		}
		t, at, by = t+step, next, better
	}
	if t == 0 {
		return Suspect{}, false
	}
	return Suspect{
		Slot: id, Name: f.a.Circuit.Slots[id].Name, From: from, To: from * math.Exp(t), Explained: 1 - by/start, After: f.a.read(at),
	}, true
}

// toward takes a step, or the largest half, quarter … of it that leads nearer.
func (f *fit) toward(id netlist.SlotID, from, t float64, step *float64, before float64) (*solve.Point, float64) {
	for range fitHalves {
		if p := f.point(id, from*math.Exp(t+*step)); p != nil {
			r := f.residuals(p)
			if by := dot(r, r); by < before {
				return p, by
			}
		}
		*step /= 2
	}
	return nil, before
}

// point solves with another number, near the full solution.
func (f *fit) point(id netlist.SlotID, number float64) *solve.Point {
	values := f.a.Circuit.Values()
	values[id] = number
	f.a.Circuit.Propagate(values)
	s := f.s.Clone() // a point leans on its system
	s.Apply(values)
	res, err := solve.SolveSystem(s, solve.Options{Near: f.a.Full.Volts()})
	if err != nil || res.Point.Unstable {
		return nil
	}
	return res.Point
}
