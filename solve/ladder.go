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
	broken  string // a transistor whose Early factor made a point meaningless
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
}

// climb goes up until a point could be stable and meets all that is asked.
func (l *ladder) climb() {
	if l.o.Near != nil {
		l.try(rung{"near", (*ladder).near})
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

func (l *ladder) try(r rung) {
	l.s.SetRamp(mna.Full)
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
	way := l.tried[len(l.tried)-1].Way
	p := newPoint(l.s, x, Evidence{
		LastStep: r.LastStep, Steps: steps, Way: way,
		Attempts: len(l.tried), Fallbacks: l.s.Fallbacks,
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
	return newton.Solve(l.s, x, &l.work, o)
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

// near starts from the wished voltages; nodes without a wish start where the
// linear circuit with those junction voltages puts them.
func (l *ladder) near() (int, string) {
	x := l.zero()
	for node, v := range l.o.Near {
		l.s.Place(x, node, v)
	}
	l.s.From(x)
	steps, ended := l.land(x, 0, newton.Options{Damped: true, MaxMove: 1})
	if len(l.found) == 0 {
		x = l.zero()
		for node, v := range l.o.Near {
			l.s.Place(x, node, v)
		}
		l.s.From(x)
		return l.land(x, steps, newton.Options{})
	}
	return steps, ended
}

// fromRest is a damped iteration from all nodes at 0 V.
func (l *ladder) fromRest() (int, string) {
	x := l.zero()
	l.s.From(x)
	return l.land(x, 0, newton.Options{MaxSteps: 200, Damped: true})
}

// shuntRamp ties every node to gnd by a conductance and takes it away by
// decades. The last, without it, is the real circuit.
func (l *ladder) shuntRamp() (int, string) {
	x, steps := l.zero(), 0
	l.s.Restart()
	// From 0.1 S, which rules any bias network, to 1e-15 S, which none feels.
	for exponent := -1; exponent >= -15; exponent-- {
		ramp := mna.Full
		ramp.Shunt = math.Pow(10, float64(exponent))
		l.s.SetRamp(ramp)
		r := l.iterate(x, newton.Options{})
		steps += r.Steps
		if r.Outcome != newton.Converged {
			l.s.SetRamp(mna.Full)
			l.blame(x)
			return steps, fmt.Sprintf("at a shunt of %g S it %s", ramp.Shunt, r.Outcome)
		}
	}
	l.s.SetRamp(mna.Full)
	return l.land(x, steps, newton.Options{})
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
