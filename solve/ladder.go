package solve

import (
	"fmt"
	"math"
	"sort"

	"biaswright/netlist"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// A ladder tries strategies, from the quick to the sure, and keeps every
// distinct point that they find.
type ladder struct {
	s     *mna.System
	o     Options
	work  newton.Work
	tried []Attempt
	found []*Point
	// worst is where the last failed rung left the balances.
	worst   string
	worstBy float64
	// precise, once made, takes over from s for the rest of its rung.
	precise *mna.Precise
	// thorough asks for every point that a way comes by, whatever is known.
	thorough bool
	broken   string // a transistor whose Early factor made a point meaningless
}

// A rung finds points from nothing: it calls admit for each, and says in words
// how it ended.
type rung struct {
	way string
	run func(l *ladder) (steps int, ended string)
}

var rungs = []rung{
	{"direct", (*ladder).direct},
	{"from rest", (*ladder).fromRest},
	{"shunt ramp", (*ladder).shuntRamp},
	{"source ramp", (*ladder).sourceRamp},
	{"gain ramp", (*ladder).gainArc},
	{"supply arc", (*ladder).supplyArc},
	{"settling", (*ladder).settling},
	{"box search", (*ladder).boxes},
}

// climb goes up until a point could be stable and meets all that is asked.
func (l *ladder) climb() {
	if l.o.Near != nil {
		l.try(rung{"near", (*ladder).near})
		if !l.close() { // Newton may lead away, as from a dead state
			l.try(rung{"box search", (*ladder).search})
		}
		if len(l.found) > 0 {
			return
		}
	}
	for _, r := range rungs {
		l.try(r)
		if l.satisfied() {
			return
		}
	}
}

// close tells whether a point has been found that is where it was asked for.
func (l *ladder) close() bool {
	const asked = 0.02 // V; somebody typed it
	for _, p := range l.found {
		if l.distance(p) < asked {
			return true
		}
	}
	return false
}

func (l *ladder) try(r rung) {
	l.s.SetRamp(mna.Full)
	l.precise = nil
	l.tried = append(l.tried, Attempt{Way: r.way})
	before := len(l.found)
	steps, ended := r.run(l)
	a := &l.tried[len(l.tried)-1]
	a.Steps, a.Ended = steps, ended
	l.s.SetRamp(mna.Full)
	if len(l.found) > before {
		a.Found = true
	}
	l.tracef("%s: %s after %d steps", r.way, ended, steps)
}

func (l *ladder) tracef(format string, args ...any) {
	if l.o.Trace != nil {
		l.o.Trace(fmt.Sprintf(format, args...))
	}
}

func (l *ladder) satisfied() bool {
	for _, p := range l.found {
		if p.Unstable || l.dead(p) {
			continue
		}
		if _, all := met(p); all {
			return true
		}
	}
	return false
}

// dead tells a point at which a circuit with transistors hardly draws anything
// from its supplies: a self-biased cell that has not started. It may be all there
// is, but the ladder looks on for another.
func (l *ladder) dead(p *Point) bool {
	const hardly = 1e-4 // of a current of the circuit's own size; leakage is far below
	for i := range p.Circuit.Elements {
		if p.Circuit.Elements[i].Kind == netlist.TransistorPart {
			return len(p.Rails) > 0 && p.railCurrents() < hardly*l.s.StartCurrent()
		}
	}
	return false
}

// result picks the point.
func (l *ladder) result() (*Result, error) {
	if len(l.found) == 0 {
		return nil, l.failure()
	}
	if l.o.Near != nil {
		sort.SliceStable(l.found, func(i, j int) bool { return l.distance(l.found[i]) < l.distance(l.found[j]) })
	} else {
		sort.SliceStable(l.found, func(i, j int) bool { return better(l.found[i], l.found[j]) })
	}
	return &Result{Point: l.found[0], Others: l.found[1:], Tried: l.tried}, nil
}

// distance of a point from the wished voltages, the largest difference in V.
func (l *ladder) distance(p *Point) float64 {
	d := 0.0
	for node, v := range l.o.Near {
		d = math.Max(d, math.Abs(p.NodeV[node]-v))
	}
	return d
}

// better says whether a is the point rather than b: one that could be stable,
// then the one that meets more, then the one whose rails deliver more, then the
// lower voltage at the first node in file order that differs.
func better(a, b *Point) bool {
	if a.Unstable != b.Unstable {
		return b.Unstable
	}
	ma, _ := met(a)
	mb, _ := met(b)
	if ma != mb {
		return ma > mb
	}
	// Two points of one circuit are told apart by more than rounding.
	const same = 1e-9
	if ra, rb := a.railCurrents(), b.railCurrents(); math.Abs(ra-rb) > same*math.Max(ra, rb) {
		return ra > rb
	}
	for i, v := range a.NodeV {
		if w := b.NodeV[i]; math.Abs(v-w) > samePoint {
			return v < w
		}
	}
	return false
}

// samePoint is the voltage in V below which two roots are one: far above the
// stopping rule's step, far below any distance that matters to a circuit.
const samePoint = 1e-7

// admit keeps x as a point, unless it is known or means nothing.
func (l *ladder) admit(x []float64, r newton.Result, steps int) string {
	for _, p := range l.found {
		if distance(p.x, x) < samePoint {
			return "came to a point already known"
		}
	}
	p := newPoint(l.s, x, Evidence{
		LastStep: r.LastStep, Steps: steps, Way: l.tried[len(l.tried)-1].Way, Determinant: l.detSign(x),
		Attempts: len(l.tried), Fallbacks: l.s.Fallbacks, Twofold: l.precise != nil,
	})
	if name := p.state.EarlyBroken(); name != "" {
		l.broken = name
		return "gave a point beyond the Early voltage of " + name + ", which is none"
	}
	l.found = append(l.found, p)
	if p.Unstable {
		return "gave a point that cannot be stable"
	}
	return "gave a point"
}

func distance(a, b []float64) float64 {
	d := 0.0
	for i, v := range a {
		d = math.Max(d, math.Abs(v-b[i]))
	}
	return d
}

// iterate runs Newton from x in place and tells the trace.
func (l *ladder) iterate(x []float64, o newton.Options) newton.Result {
	if l.o.Trace != nil {
		o.OnStep = func(step int, size float64, exact bool) {
			guarded := ""
			if !exact {
				guarded = ", junctions guarded"
			}
			l.tracef("  step %d: largest voltage step %.3g V%s", step, size, guarded)
		}
	}
	if l.precise != nil {
		return newton.Solve(l.precise, x, &l.work, o)
	}
	return newton.Solve(l.s, x, &l.work, o)
}

// detSign is the sign of the determinant at x, by the system in use.
func (l *ladder) detSign(x []float64) int {
	if l.precise == nil {
		return l.s.DetSign(x)
	}
	l.s.From(x)
	l.precise.Linearise(x)
	return l.precise.DetSign()
}

// land iterates on the real circuit from x and admits what it comes to.
func (l *ladder) land(x []float64, before int, o newton.Options) (steps int, ended string) {
	r := l.iterate(x, o)
	steps = before + r.Steps
	if r.Outcome != newton.Converged {
		l.blame(x)
		return steps, r.Outcome.String()
	}
	return steps, l.admit(x, r, steps)
}

// blame notes the worst balance at the place where a rung failed.
func (l *ladder) blame(x []float64) {
	for _, v := range x {
		if v-v != 0 {
			return
		}
	}
	if amps, row := l.s.Worst(x); row >= 0 {
		l.worst, l.worstBy = l.s.Label(row), amps
	}
}

func (l *ladder) zero() []float64 { return make([]float64, l.s.Size()) }

// direct is a Newton iteration with every junction started where it conducts.
func (l *ladder) direct() (int, string) {
	l.s.Restart()
	return l.land(l.zero(), 0, newton.Options{})
}

// near ties the wished nodes to their voltages, lets the others follow, and lets
// go: once at a stroke, which may lead to a point that cannot be stable, and once
// slowly, which leads to where the circuit would come to rest.
func (l *ladder) near() (steps int, ended string) {
	const tie = 10 // S; holds any node of a bias network
	x := l.zero()
	ramp := mna.Full
	ramp.Shunt = tie
	l.s.AnchorNodes(l.o.Near)
	l.s.SetRamp(ramp)
	l.s.Restart()
	r := l.iterate(x, newton.Options{})
	l.s.Release()
	l.s.SetRamp(mna.Full)
	// Where a circuit draws next to nothing, what rounding leaves at a tied node is more
	// than its balance admits; the voltages are there all the same.
	const still = 1e-9 // V
	if steps = r.Steps; r.Outcome != newton.Converged && !(r.LastStep < still) {
		return steps, "with the nodes held there it " + r.Outcome.String()
	}
	at := append([]float64(nil), x...)
	l.s.From(at)
	steps, ended = l.land(at, steps, newton.Options{})
	steps += l.settle(x)
	l.s.From(x)
	more, again := l.land(x, steps, newton.Options{})
	if len(l.found) == 0 {
		ended = again
	}
	return more, ended
}

// fromRest is a damped iteration from all nodes at 0 V.
func (l *ladder) fromRest() (int, string) {
	x := l.zero()
	l.s.From(x)
	return l.land(x, 0, newton.Options{MaxSteps: 200, Damped: true})
}

// shuntRamp ties every node to gnd by a conductance and takes it away. The last,
// without it, is the real circuit.
func (l *ladder) shuntRamp() (int, string) {
	x := l.zero()
	steps, ended := l.shunts(mna.Full, x)
	if ended != "" {
		return steps, ended
	}
	return l.land(x, steps, newton.Options{})
}

// shunts leads x in place from the shunted circuit to one whose shunts nothing
// feels, by factors that shrink where Newton fails and grow where it does not. The
// ramp's other factors stay; ended says in words why it failed, or is "".
func (l *ladder) shunts(ramp mna.Ramp, x []float64) (steps int, ended string) {
	const (
		// 10 S holds every node of a bias network near gnd. What holds the middle
		// of two like junctions in reverse shrinks by a decade for every 60 mV of
		// ideality 1; the last is as far as a double goes.
		first, last = 10, 1e-290
		least       = 1.1 // a factor below it leads nowhere
		most        = 1e8 // some twenty steps, by a thermal voltage each
	)
	defer l.s.SetRamp(ramp) // as it was given
	trial := l.zero()
	l.s.Restart()
	good, factor := math.Inf(1), 10.0
	for next := float64(first); ; next = good / factor {
		ramp.Shunt = next
		l.s.SetRamp(ramp)
		copy(trial, x)
		if !math.IsInf(good, 1) {
			l.s.From(trial)
		}
		r := l.iterate(trial, newton.Options{MaxSteps: 30})
		steps += r.Steps
		switch {
		case r.Outcome == newton.Converged:
			copy(x, trial)
			good, factor = next, math.Min(factor*factor, most)
			if good < last {
				return steps, ""
			}
		case math.IsInf(good, 1):
			return steps, "at the first shunt it " + r.Outcome.String()
		default:
			if factor = math.Sqrt(factor); factor >= least {
				continue
			}
			if l.precise == nil { // leakage, perhaps, that doubles cannot see
				l.precise = l.s.Precise()
				factor = 10
				continue
			}
			ramp.Shunt = 0
			l.s.SetRamp(ramp)
			l.blame(x)
			return steps, fmt.Sprintf("at a shunt of %.3g S it %s", next, r.Outcome)
		}
	}
}

// sourceRamp raises all supplies together from 0, with steps that shrink where
// Newton fails and grow where it does not.
func (l *ladder) sourceRamp() (int, string) {
	const (
		first = 0.1  // of the supplies
		least = 1e-4 // below it the branch has turned back: arc length is wanted
	)
	x, steps := l.zero(), 0
	trial := l.zero()
	l.s.From(x)
	for at, step := 0.0, first; at < 1; {
		next := math.Min(1, at+step)
		ramp := mna.Full
		ramp.Source = next
		l.s.SetRamp(ramp)
		copy(trial, x)
		l.s.From(trial)
		r := l.iterate(trial, newton.Options{MaxSteps: 40})
		steps += r.Steps
		if r.Outcome == newton.Converged {
			copy(x, trial)
			at = next
			step *= 2
			continue
		}
		if step /= 4; step < least {
			l.s.SetRamp(mna.Full)
			l.blame(x)
			return steps, fmt.Sprintf("at %.3g of the supplies it %s", next, r.Outcome)
		}
	}
	l.s.SetRamp(mna.Full)
	return l.land(x, steps, newton.Options{})
}
