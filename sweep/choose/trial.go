package choose

import (
	"errors"
	"math"
	"slices"

	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// A bench is the circuit at one combination of ends, with the unknowns free to move:
// each value is solved from where the last one left off.
type bench struct {
	c     *netlist.Circuit
	ends  []End
	s     *mna.System
	tuner *mna.Tuner
	how   start
	x     []float64
	state *mna.State
	work  newton.Work
	warm  bool // x solves the circuit at the last values
	seen  int  // the combination last solved, by trial.count
	gains []*gain
}

// A gain is the derivative of a requirement by slot, for one combination.
type gain struct {
	seen int
	d    []float64
}

// A start is how a circuit is solved from nothing.
type start struct {
	// ladder goes up the whole ladder of strategies at once: what a plain start leads to
	// is not the point that package solve picks, as in a self-biased cell that has a
	// state without current.
	ladder bool
	home   []float64 // the point that was picked then, to start from elsewhere
	near   map[netlist.NodeID]float64
}

// startFor finds out how a circuit wants to be started.
func startFor(c *netlist.Circuit, near map[netlist.NodeID]float64) (start, error) {
	how := start{near: near}
	if near != nil {
		return how, nil
	}
	b, err := newBench(c, nil, nil, how)
	if err != nil {
		return how, err
	}
	plain := b.at(nil)
	x := slices.Clone(b.x)
	res, err := solve.SolveSystem(b.s, solve.Options{})
	if err != nil {
		return how, nil // with other values, perhaps
	}
	const same = 1e-6 // V; two points lie further apart
	if !plain || furthest(x, res.Point.Unknowns()) > same {
		how.ladder, how.home = true, res.Point.Unknowns()
	}
	return how, nil
}

func newBench(c *netlist.Circuit, ends []End, unknowns []Unknown, how start) (*bench, error) {
	s, err := mna.New(c)
	if err != nil {
		return nil, err
	}
	slots := make([]netlist.SlotID, len(unknowns))
	for i := range unknowns {
		slots[i] = unknowns[i].slot
	}
	return &bench{c: c, ends: ends, s: s, tuner: s.NewTuner(slots...), how: how, x: make([]float64, s.Size())}, nil
}

// at solves the circuit with these values, in ohms. It reports false where no
// operating point was found.
func (b *bench) at(ohms []float64) bool {
	return b.tuner.Set(ohms...) && b.settle()
}

// settle solves with the values in force, from the last solution or from nothing.
func (b *bench) settle() bool {
	// A solution one value away needs a few steps; one that needs more has lost its
	// branch.
	const few = 15
	if b.warm {
		b.s.Continue()
		if b.iterate(few) {
			return true
		}
	}
	b.warm = false
	if len(b.how.home) == len(b.x) && b.how.ladder {
		copy(b.x, b.how.home)
		b.s.From(b.x)
		if b.iterate(newton.DefaultSteps) {
			return true
		}
	}
	if !b.how.ladder && b.how.near == nil {
		b.s.Restart()
		clear(b.x)
		if b.iterate(newton.DefaultSteps) {
			return true
		}
	}
	res, err := solve.SolveSystem(b.s, solve.Options{Near: b.how.near})
	if err != nil || res.Point.Unstable {
		return false
	}
	copy(b.x, res.Point.Unknowns())
	b.s.From(b.x)
	return b.iterate(newton.DefaultSteps)
}

// iterate goes on from x, and takes what it comes to unless that means nothing or
// cannot be stable.
func (b *bench) iterate(steps int) bool {
	if r := newton.Solve(b.s, b.x, &b.work, newton.Options{MaxSteps: steps}); r.Outcome != newton.Converged || b.s.LastSign() < 0 {
		return false
	}
	if b.state == nil {
		b.state = b.s.StateAt(b.x)
	} else {
		b.state.Polished(b.x)
	}
	b.warm = b.state.EarlyBroken() == ""
	return b.warm
}

// startFrom takes another bench's solution as the one to start from.
func (b *bench) startFrom(o *bench) {
	copy(b.x, o.x)
	b.s.From(b.x)
	b.warm = true
}

// A variable is what is drawn with one tolerance: a number, or several that a batch
// draws together.
type variable []draw

// A draw is one number with its tolerance.
type draw struct {
	slot    netlist.SlotID
	follows bool // it follows others until drawn
}

// end is the number at one end of its tolerance.
func (d draw) end(c *netlist.Circuit, value float64, high bool) float64 {
	return c.Slots[d.slot].Bounds.End(value, high)
}

// A trial judges combinations of values.
type trial struct {
	c         *netlist.Circuit
	nominal   *bench
	corners   []*bench // the nominal one first
	spread    *bench   // for corners of tolerances; its numbers are put in force whole
	variables []variable
	values    []float64 // scratch of turn

	requirements []requirement
	probes       []probe
	order        []int // of the probes: what rules combinations out first
	tally        tally
	ohms         []float64 // the combination in hand
	count        int       // combinations so far
}

// mostRanges are crossed with each other, 2^6 corners; ranges beyond these are turned
// against each requirement as tolerances are.
const mostRanges = 6

func newTrial(c *netlist.Circuit, unknowns []Unknown, how start) (*trial, error) {
	t := &trial{c: c, values: make([]float64, len(c.Slots)), requirements: requirementsOf(c)}
	elsewhere := start{ladder: how.ladder, home: how.home} // voltages wished for are those of the nominal point
	var err error
	if t.nominal, err = newBench(c, nil, unknowns, how); err != nil {
		return nil, err
	}
	t.corners = []*bench{t.nominal}
	ranges := rangesOf(c)
	crossed := ranges[:min(len(ranges), mostRanges)]
	for k := range 1 << len(crossed) {
		if len(crossed) == 0 {
			break
		}
		var ends []End
		var settings []netlist.Setting
		for i, r := range crossed {
			e := End{Name: r.Name, Slot: r.Slot, High: k>>i&1 == 1, Range: true}
			e.Value = draw{slot: r.Slot}.end(c, c.Value(r.Slot), e.High)
			ends = append(ends, e)
			side := "low"
			if e.High {
				side = "high"
			}
			settings = append(settings, netlist.Setting{Name: r.Name, Value: side})
		}
		at, list := c.At(settings...)
		if list.HasErrors() {
			return nil, errors.New(list[0].Message)
		}
		b, err := newBench(at, ends, unknowns, elsewhere)
		if err != nil {
			return nil, err
		}
		t.corners = append(t.corners, b)
	}
	t.variables = variablesOf(c, ranges[len(crossed):])
	if len(t.variables) > 0 {
		if t.spread, err = newBench(c, nil, unknowns, elsewhere); err != nil {
			return nil, err
		}
	}
	t.probes = t.probesOf()
	for i := range t.probes {
		t.order = append(t.order, i)
	}
	for _, b := range t.corners {
		for range t.requirements {
			b.gains = append(b.gains, &gain{})
		}
	}
	return t, nil
}

// rangesOf lists the rails and the ambient that have a stated range.
func rangesOf(c *netlist.Circuit) []End {
	var out []End
	add := func(name string, id netlist.SlotID) {
		if b := &c.Slots[id].Bounds; b.Stated && b.Low != b.High {
			out = append(out, End{Name: name, Slot: id, Range: true})
		}
	}
	for i := range c.Rails {
		add(c.Rails[i].Name, c.Rails[i].Volts)
	}
	add("ambient", c.Ambient)
	return out
}

// variablesOf lists what has a tolerance: given values, then the elements' numbers in
// file order; what a batch draws together is one.
func variablesOf(c *netlist.Circuit, more []End) []variable {
	var out []variable
	batched := map[[2]int]int{} // batch and place within an element -> index into out
	add := func(id netlist.SlotID, batch, place int) {
		if id == netlist.None {
			return
		}
		s := &c.Slots[id]
		if !s.Bounds.Stated || math.IsNaN(s.Value) || s.Bounds.Low == s.Bounds.High && s.Bounds.Relative == 0 {
			return
		}
		d := draw{id, c.Follows(id)}
		if at, known := batched[[2]int{batch, place}]; known && batch >= 0 {
			out[at] = append(out[at], d)
			return
		}
		batched[[2]int{batch, place}] = len(out)
		out = append(out, variable{d})
	}
	for _, e := range more {
		add(e.Slot, netlist.None, 0)
	}
	for _, id := range c.Givens {
		add(id, netlist.None, 0)
	}
	for i := range c.Elements {
		e := &c.Elements[i]
		batch := slices.IndexFunc(c.Batches, func(b []int) bool { return slices.Contains(b, i) })
		for place, id := range append([]netlist.SlotID{e.Value, e.TC, e.Size}, e.Params...) {
			add(id, batch, place)
		}
	}
	return out
}

// A key orders combinations; see the package's documentation.
type key struct {
	burnt bool    // a rating is exceeded
	off   bool    // something is missed at the nominal point already
	miss  float64 // of targets and keeps, the largest
	lost  float64 // of the hold, the largest
	pairs int     // resistors more than one a value
	score float64
	away  float64
	at    int // place in the grid; pairs stand behind it
}

// worstKey is behind every other.
var worstKey = key{burnt: true, off: true, miss: math.Inf(1), lost: math.Inf(1), score: math.Inf(1), away: math.Inf(1), at: math.MaxInt}

// less compares scores and distances to so many parts of a band or of an e-fold:
// above what rounding does to a solution, below what matters.
func (a key) less(b key) bool {
	const parts = 1e9
	switch {
	case a.burnt != b.burnt:
		return b.burnt
	case a.whole() != b.whole():
		return a.whole()
	case a.off != b.off:
		return b.off
	case !alike(a.miss, b.miss, parts):
		return a.miss < b.miss
	case !alike(a.lost, b.lost, parts):
		return a.lost < b.lost
	case a.whole() && a.pairs != b.pairs:
		return a.pairs < b.pairs
	case !alike(a.score, b.score, parts):
		return a.score < b.score
	case !alike(a.away, b.away, parts):
		return a.away < b.away
	}
	return a.at < b.at
}

// whole tells that nothing is missed, as far as is known.
func (a *key) whole() bool { return a.miss == 0 && a.lost == 0 }

func alike(a, b, parts float64) bool {
	return a == b || math.Round(a*parts) == math.Round(b*parts)
}

// A tally is what is known so far of one combination.
type tally struct {
	key
	met   []bool // by requirement, in the order of verdicts
	unmet int
}

func (y *tally) begin(requirements int, k key) {
	y.key, y.unmet = k, 0
	y.met = y.met[:0]
	for range requirements {
		y.met = append(y.met, true)
	}
}

// add takes what was seen at one corner. Nothing is met where there is no operating
// point.
func (y *tally) add(g sight) {
	for i := range y.met {
		if y.met[i] && (g.failed || i < len(g.verdicts) && !g.verdicts[i].Met) {
			y.met[i] = false
			y.unmet++
		}
	}
	if g.failed {
		y.miss, y.lost, y.score = math.Inf(1), math.Inf(1), math.Inf(1)
	}
	for i := range g.verdicts {
		v := &g.verdicts[i]
		if v.Kind == "target" {
			y.score = math.Max(y.score, Deviation(v))
		}
		switch {
		case v.Met:
		case v.Kind == "hold":
			y.lost = math.Max(y.lost, missOf(v))
		default:
			y.miss = math.Max(y.miss, missOf(v))
		}
	}
	y.burnt = y.burnt || len(g.exceeded) > 0
}

// missOf is by how much a requirement is missed: beyond its band in units of the band, or
// beyond a keep's bound as a fraction of the bound, of which a bound of 0 has none and
// counts whole.
func missOf(v *solve.Verdict) float64 {
	const least = 1e-9 // a bound is strict: what stands on it is missed by nothing
	by := math.Inf(1)
	switch {
	case math.IsNaN(v.Margin):
	case v.Kind != "keep":
		by = Deviation(v) - 1
	default:
		bound := v.Low
		if math.IsInf(bound, 0) {
			bound = v.High
		}
		if by = 1; bound != 0 {
			by = -v.Margin / math.Abs(bound)
		}
	}
	return math.Max(by, least)
}

// verdicts judges a solution. A hold is judged only where the file states one, against
// the nominal point of the same values.
func (t *trial) verdicts(p netlist.Env) []solve.Verdict {
	if t.c.Hold == nil {
		return solve.JudgeAt(t.c, p, nil)
	}
	return solve.JudgeAt(t.c, p, t.nominal.state)
}

// A requirement is what tolerances are turned against: left, less right where there is
// one, in each sense that has a bound.
type requirement struct {
	left, right *netlist.Expr
	senses      []bool // true is up
}

// requirementsOf lists targets, keeps and hold, in the order of verdicts.
func requirementsOf(c *netlist.Circuit) []requirement {
	both := []bool{false, true}
	var out []requirement
	for i := range c.Targets {
		out = append(out, requirement{c.Targets[i].Q, nil, both})
	}
	for i := range c.Keeps {
		k := &c.Keeps[i]
		out = append(out, requirement{k.Left, k.Right, []bool{!k.Greater}})
	}
	if c.Hold != nil {
		out = append(out, requirement{c.Hold.Q, nil, both})
	}
	return out
}

// A probe is one thing to look at: a corner of the ranges, its ratings, or its
// tolerances turned against a requirement.
type probe struct {
	corner  int
	ratings bool
	against int // a requirement, or -1
	up      bool
}

// probesOf lists every probe: the nominal point first, then the ends of the ranges, then
// ratings and tolerances there.
func (t *trial) probesOf() []probe {
	var out []probe
	for i := range t.corners {
		out = append(out, probe{corner: i, against: -1})
	}
	for i := range t.corners {
		if rated(t.c) {
			out = append(out, probe{corner: i, against: -1, ratings: true})
		}
		if len(t.variables) == 0 {
			continue
		}
		for r := range t.requirements {
			for _, up := range t.requirements[r].senses {
				out = append(out, probe{corner: i, against: r, up: up})
			}
		}
	}
	return out
}

// rated tells whether anything in the circuit has a rating.
func rated(c *netlist.Circuit) bool {
	return slices.ContainsFunc(c.Elements, func(e netlist.Element) bool {
		if e.Rating != netlist.None {
			return true
		}
		for i, id := range e.Params {
			if c.Parts[e.Part].Kind.Params[i].Rating && !math.IsNaN(c.Value(id)) {
				return true
			}
		}
		return false
	})
}

// A sight is what a probe shows.
type sight struct {
	ends     []End
	failed   bool // no operating point
	verdicts []solve.Verdict
	exceeded []solve.Caution // ratings
}

// visit looks at a combination by the probes in that order, the nominal point always
// first, until tell returns false.
func (t *trial) visit(ohms []float64, order []int, tell func(probe int, g sight) bool) {
	t.ohms = ohms
	t.count++
	if g, _ := t.look(t.probes[0]); !tell(0, g) || g.failed {
		return
	}
	for _, k := range order {
		if k == 0 {
			continue
		}
		g, ok := t.look(t.probes[k])
		if ok && !tell(k, g) {
			return
		}
		if ok && !g.failed && t.probes[k].against >= 0 {
			if g, ok = t.lookAgain(t.probes[k]); ok && !tell(k, g) {
				return
			}
		}
	}
}

// look makes one probe of the combination in hand. It reports false where there is
// nothing to see.
func (t *trial) look(p probe) (sight, bool) {
	b := t.corners[p.corner]
	if b.seen != t.count {
		b.seen = t.count
		if p.corner > 0 && !b.warm {
			b.startFrom(t.nominal)
		}
		b.warm = b.at(t.ohms)
	}
	switch {
	case !b.warm:
		return sight{ends: b.ends, failed: true}, true
	case p.ratings:
		return t.lookAtRatings(b)
	case p.against >= 0:
		return t.lookAgainst(b, p)
	default:
		return sight{ends: b.ends, verdicts: t.verdicts(b.state)}, true
	}
}

func (t *trial) lookAtRatings(b *bench) (sight, bool) {
	g := sight{ends: b.ends}
	for _, c := range solve.Cautions(solve.PointAt(b.s, b.x, "warm")) {
		if c.Kind == "rating" {
			g.exceeded = append(g.exceeded, c)
		}
	}
	return g, len(g.exceeded) > 0
}

// lookAgainst puts every tolerance at the end that moves a requirement's left less right
// down or up, and solves there.
func (t *trial) lookAgainst(b *bench, p probe) (sight, bool) {
	gain := b.gains[p.against]
	if gain.seen != t.count {
		gain.seen = t.count
		gain.d = t.gain(b, &t.requirements[p.against])
	}
	if gain.d == nil {
		return sight{}, false // it has no number here, which the verdict says
	}
	return t.turned(b, gain.d, p.up)
}

// lookAgain turns the tolerances by the derivatives where lookAgainst has turned them to.
// It reports false where that is the same corner.
func (t *trial) lookAgain(p probe) (sight, bool) {
	b := t.corners[p.corner]
	before, now := b.gains[p.against].d, t.gain(t.spread, &t.requirements[p.against])
	if now == nil || !slices.ContainsFunc(t.variables, func(v variable) bool {
		return t.slope(b, before, v) > 0 != (t.slope(b, now, v) > 0)
	}) {
		return sight{}, false
	}
	return t.turned(b, now, p.up)
}

// turned is what is seen with the tolerances turned. It reports false where none moves what
// has the gain.
func (t *trial) turned(b *bench, gain []float64, up bool) (sight, bool) {
	ends, ok := t.turn(b, gain, up)
	if len(ends) == 0 {
		return sight{}, false
	}
	g := sight{ends: append(slices.Clip(b.ends), ends...), failed: !ok}
	if ok {
		g.verdicts = t.verdicts(t.spread.state)
	}
	return g, true
}

// gain is the derivative of left less right by slot; nil where there is none.
func (t *trial) gain(b *bench, r *requirement) []float64 {
	_, d, err := b.state.Sensitivity(r.left)
	if err != nil || r.right == nil {
		return d
	}
	_, less, err := b.state.Sensitivity(r.right)
	if err != nil {
		return nil
	}
	for i := range d {
		d[i] -= less[i]
	}
	return d
}

// turn puts the tolerances at the ends that the gain shows, and solves there from b's
// solution.
func (t *trial) turn(b *bench, gain []float64, up bool) ([]End, bool) {
	copy(t.values, b.s.Values())
	var ends []End
	followers := 0 // of the ends, behind the others
	for _, following := range []bool{false, true} {
		for _, v := range t.variables {
			high := t.slope(b, gain, v) > 0 == up
			for _, d := range v {
				if d.follows != following || gain[d.slot] == 0 {
					continue
				}
				e := End{Name: t.c.Slots[d.slot].Name, Slot: d.slot, High: high}
				if following {
					followers++
				} else {
					e.Value = d.end(t.c, t.values[d.slot], high)
					t.values[d.slot] = e.Value
				}
				ends = append(ends, e)
			}
		}
	}
	if len(ends) == 0 {
		return nil, false
	}
	// What follows a drawn number follows it as drawn, and is then drawn itself.
	drawn := ends[len(ends)-followers:]
	b.c.PropagateWith(t.values, func(id netlist.SlotID, number float64) float64 {
		for i := range drawn {
			if e := &drawn[i]; e.Slot == id {
				e.Value = draw{slot: id}.end(t.c, number, e.High)
				return e.Value
			}
		}
		return number
	})
	s := t.spread
	s.s.Apply(t.values)
	s.startFrom(b)
	return ends, s.settle()
}

// slope is what a variable does to the quantity from its lower to its upper end.
func (t *trial) slope(b *bench, gain []float64, v variable) float64 {
	sum := 0.0
	for _, d := range v {
		now := b.s.Values()[d.slot]
		sum += gain[d.slot] * (d.end(t.c, now, true) - d.end(t.c, now, false))
	}
	return sum
}

// judge gives a combination its key. It ends as soon as the key can only come behind
// limit; the key is then a lower bound.
func (t *trial) judge(ohms []float64, k, limit key) key {
	y := &t.tally
	y.begin(len(t.requirements), k)
	last := 0
	t.visit(ohms, t.order, func(probe int, g sight) bool {
		y.add(g)
		if probe == 0 { // the nominal point comes first
			y.off = !y.whole()
		}
		last = probe
		return y.key.less(limit)
	})
	if last > 0 && !y.key.less(limit) {
		t.favour(last)
	}
	return y.key
}

// favour puts a probe to the front: what ruled this combination out will rule out its
// neighbours.
func (t *trial) favour(probe int) {
	at := slices.Index(t.order, probe)
	copy(t.order[1:at+1], t.order[:at])
	t.order[0] = probe
}
