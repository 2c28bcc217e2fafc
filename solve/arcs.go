package solve

import (
	"fmt"

	"biaswright/solve/follow"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// An arc may run past the real circuit, at 1, and fold back to it. Supplies are
// followed to twice their size both ways. Gains much above 1 make conductances
// negative, where branches have no end: they are followed a little beyond.
const (
	sourceHigh, sourceLow = 2, -2
	gainHigh, gainLow     = 1.2, -1
	arcSteps              = 3000 // a few dozen junctions need some hundred
	// Once some point is known, an arc only looks for one that meets more: it may
	// then cost about a second on a large circuit, by unknowns times steps.
	arcWork, arcLeast = 300_000, 200
)

// gainArc follows the circuit from gains of zero, where it has one point, to its
// real gains, through folds, and collects every passage.
func (l *ladder) gainArc() (int, string) {
	x := l.zero()
	apart := mna.Ramp{Source: 1, Gain: 0}
	l.s.SetRamp(apart)
	l.s.Restart()
	r := l.iterate(x, newton.Options{})
	if r.Outcome != newton.Converged {
		clear(x)
		steps, ended := l.shunts(apart, x)
		r.Steps += steps
		if ended == "" {
			again := l.iterate(x, newton.Options{})
			r.Steps += again.Steps
			if again.Outcome != newton.Converged {
				ended = "it " + again.Outcome.String()
			}
		}
		if ended != "" {
			l.s.SetRamp(mna.Full)
			return r.Steps, "without gains " + ended
		}
	}
	return l.arc(l.s.Gains(), x, 0, +1, gainLow, gainHigh, r.Steps)
}

// supplyArc follows the circuit from no supply, where every voltage is 0, to its
// real supplies, through folds, and collects every passage.
func (l *ladder) supplyArc() (int, string) {
	return l.arc(l.s.Sources(), l.zero(), 0, +1, sourceLow, sourceHigh, 0)
}

// around follows the supplies from each known point, up and down, and collects what else
// lies on its branch: a closed branch that nothing leads to from zero is walked round.
func (l *ladder) around() (steps int, ended string) {
	for i := 0; i < len(l.found); i++ { // what is found on the way is followed too
		for _, direction := range []int{+1, -1} {
			x := append([]float64(nil), l.found[i].x...)
			steps, ended = l.arc(l.s.Sources(), x, 1, direction, sourceLow, sourceHigh, steps)
		}
	}
	return steps, ended
}

// arcBudget is how many steps an arc may take.
func (l *ladder) arcBudget() int {
	if len(l.found) == 0 || l.thorough {
		return arcSteps
	}
	return min(arcSteps, max(arcLeast, arcWork/max(1, l.s.Size())))
}

// arc follows a family from x at a factor, in a direction, and keeps every passage of 1.
func (l *ladder) arc(f *mna.Family, x []float64, from float64, direction int, low, high float64, before int) (steps int, ended string) {
	w := follow.Follow(f, x, from, follow.Options{
		Mode: follow.ArcLength, Direction: direction, Target: 1, Use: follow.EveryPassage,
		Low: low, High: high, MaxSteps: l.arcBudget(),
	})
	steps = before + w.Stats.Corrections
	l.tracef("  the walk %s at %.4g: %d steps, %d folds, %d passages", w.Outcome, w.Lambda, w.Stats.Steps, len(w.Folds), len(w.Targets))
	l.s.SetRamp(mna.Full)
	if len(w.Targets) == 0 {
		return steps, fmt.Sprintf("the walk %s at %.3g of the way", w.Outcome, w.Lambda)
	}
	for _, p := range w.Targets {
		at := append([]float64(nil), p.X...)
		l.s.From(at)
		steps, ended = l.land(at, steps, newton.Options{})
	}
	return steps, ended
}
