package solve

import (
	"math"

	"biaswright/netlist"
)

// A Verdict is a requirement judged at a point.
type Verdict struct {
	Kind string // "target", "keep", "hold"
	Q    *netlist.Expr
	// Index into Targets or Keeps; 0 for hold.
	Index int
	Met   bool
	// Value is the quantity (a keep's left side), Low and High what is allowed
	// (infinite where there is no bound), Margin the distance to the nearer
	// bound, negative when not met, all in the quantity's unit. NaN where the
	// value is missing, and then Met is false.
	Value, Low, High, Margin float64
}

// Judge judges targets and keeps at p; with nominal not nil, hold against it
// too.
func Judge(p, nominal *Point) []Verdict {
	if nominal == nil {
		return JudgeAt(p.Circuit, p, nil)
	}
	return JudgeAt(p.Circuit, p, nominal)
}

// JudgeAt is Judge for solutions given as environments of c's expressions.
func JudgeAt(c *netlist.Circuit, p, nominal netlist.Env) []Verdict {
	var out []Verdict
	for i := range c.Targets {
		t := &c.Targets[i]
		v := Verdict{Kind: "target", Q: t.Q, Index: i}
		v.band(p, t.Value, width(t.Within, t.Relative, t.Value))
		out = append(out, v)
	}
	for i := range c.Keeps {
		out = append(out, judgeKeep(p, &c.Keeps[i], i))
	}
	if nominal == nil {
		return out
	}
	q, within, relative := HoldOf(c)
	if q == nil {
		return out
	}
	v := Verdict{Kind: "hold", Q: q}
	middle, ok := q.Eval(nominal)
	if !ok {
		middle = math.NaN()
	}
	v.band(p, middle, width(within, relative, middle))
	return append(out, v)
}

// HoldOf is what a circuit holds, and how far it may move: the hold line's
// quantity and width, without one the first target's; nil without either.
// Within is a fraction where relative, otherwise in the quantity's unit.
func HoldOf(c *netlist.Circuit) (q *netlist.Expr, within float64, relative bool) {
	if h := c.Hold; h != nil {
		return h.Q, h.Within, h.Relative
	}
	if len(c.Targets) == 0 {
		return nil, 0, false
	}
	t := &c.Targets[0]
	return t.Q, t.Within, t.Relative
}

func width(within float64, relative bool, about float64) float64 {
	if relative {
		return within * math.Abs(about)
	}
	return within
}

// band judges the quantity against middle ± width.
func (v *Verdict) band(p netlist.Env, middle, width float64) {
	v.Low, v.High = middle-width, middle+width
	value, ok := v.Q.Eval(p)
	if !ok {
		v.Value, v.Margin = math.NaN(), math.NaN()
		return
	}
	v.Value = value
	v.Margin = math.Min(value-v.Low, v.High-value)
	v.Met = v.Margin >= 0
}

func judgeKeep(p netlist.Env, k *netlist.Keep, index int) Verdict {
	v := Verdict{Kind: "keep", Q: k.Left, Index: index, Low: math.Inf(-1), High: math.Inf(1)}
	left, ok1 := k.Left.Eval(p)
	right, ok2 := k.Right.Eval(p)
	if !ok1 || !ok2 {
		v.Value, v.Margin = math.NaN(), math.NaN()
		return v
	}
	v.Value = left
	if k.Greater {
		v.Low, v.Margin = right, left-right
	} else {
		v.High, v.Margin = right, right-left
	}
	v.Met = v.Margin > 0 // a bound is strict, as written
	return v
}

// met counts the requirements that hold, and tells whether all do.
func met(p *Point) (count int, all bool) {
	verdicts := Judge(p, nil)
	for i := range verdicts {
		if verdicts[i].Met {
			count++
		}
	}
	return count, count == len(verdicts)
}
