// Package solve finds the operating point of a circuit, with its evidence.
//
// Solve climbs a ladder of strategies, from a plain Newton iteration to arc
// length in the supplies, until one gives a point that could be stable and meets
// what the file asks. A Point carries every quantity, why it is believed, and the
// exact derivatives of any quantity with respect to any value.
package solve

import (
	"biaswright/netlist"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
)

// Options steer a solve. The zero value is the ordinary one.
type Options struct {
	// Near starts the solver with these node voltages in V and picks the point
	// nearest to them.
	Near map[netlist.NodeID]float64
	// Trace, where set, is told each step in one line of text.
	Trace func(line string)
}

// A Result is the point chosen and what was seen on the way.
type Result struct {
	Point  *Point
	Others []*Point // other points that the ladder came by, the best first
	Tried  []Attempt
}

// An Attempt is one rung of the ladder.
type Attempt struct {
	Way   string // "direct", "from rest", "shunt ramp", "source ramp", "gain ramp", "supply arc", "settling", "box search", "branches"
	Steps int    // Newton steps
	Ended string // how, in words
	Found bool   // it gave a point, new or known
}

// Solve finds the operating point of c. The error is a *Failure where there is
// none, or says why the circuit cannot be set up.
func Solve(c *netlist.Circuit, o Options) (*Result, error) {
	s, err := mna.New(c)
	if err != nil {
		return nil, err
	}
	return SolveSystem(s, o)
}

// Onward finds the operating point of c by Newton's iteration from a point of a circuit that
// differs little from it, and as Solve does where that leads to none. It keeps to the
// branch of from, whatever c asks for. The error is Solve's.
func Onward(c *netlist.Circuit, from *Point) (*Point, error) {
	s, err := mna.New(c)
	if err != nil {
		return nil, err
	}
	if p := onward(s, from); p != nil {
		return p, nil
	}
	res, err := SolveSystem(s, Options{})
	if err != nil {
		return nil, err
	}
	return res.Point, nil
}

// onward is nil where the iteration does not end soon at a point that could be stable.
func onward(s *mna.System, from *Point) *Point {
	if s.Size() != len(from.x) {
		return nil
	}
	x := append([]float64(nil), from.x...)
	s.From(x)
	var work newton.Work
	const soon = 20 // steps; one that needs more has lost the branch
	n := newton.Solve(s, x, &work, newton.Options{MaxSteps: soon})
	if n.Outcome != newton.Converged {
		return nil
	}
	p := newPoint(s, x, Evidence{Way: "followed", Steps: n.Steps, LastStep: n.LastStep, Determinant: s.DetSign(x), Attempts: 1})
	if p.Unstable || p.state.EarlyBroken() != "" {
		return nil
	}
	return p
}

// SolveSystem is Solve for a system that was set up already; its values in force
// are used, and its iteration state is overwritten.
func SolveSystem(s *mna.System, o Options) (*Result, error) {
	l := &ladder{s: s, o: o}
	l.climb()
	return l.result()
}
