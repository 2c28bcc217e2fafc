package solve

import (
	"errors"

	"biaswright/solve/every"
	"biaswright/solve/interval"
	"biaswright/solve/mna"
)

// An Enclosure is intervals that surely contain the exact solution, near a point, of the
// stated equations, rounding of every coefficient included.
type Enclosure struct {
	// NodeV is by NodeID, in V; Rail what each rail delivers, in A.
	NodeV []interval.I
	Rail  []interval.I

	s *mna.System
	e *mna.Enclosure
}

// ErrNoEnclosure says that a point's existence could not be proven in doubles.
var ErrNoEnclosure = errors.New("no enclosure was found: the point is too nearly singular for doubles")

// Enclose proves that a solution exists at a point, the only one in a small box about it,
// and bounds its voltages and currents.
func Enclose(p *Point) (*Enclosure, error) {
	s, err := mna.New(p.Circuit)
	if err != nil {
		return nil, err
	}
	sys, _, err := s.Neutral()
	if err != nil {
		return nil, err
	}
	at := every.Verify(sys, p.x, mna.Slack)
	if at == nil {
		return nil, ErrNoEnclosure
	}
	e := s.Enclose(at.X)
	return &Enclosure{NodeV: e.V[:len(p.Circuit.Nodes)], Rail: e.Rail, s: s, e: e}, nil
}

// Current encloses a current of an element in A, by its symbol ("I"; "Ic", "Ib", "Ie" of a
// transistor); false where the element is an ideal voltage, whose current its neighbours
// tell.
func (e *Enclosure) Current(element int, symbol string) (interval.I, bool) {
	return e.s.ElementCurrent(e.e, element, symbol)
}
