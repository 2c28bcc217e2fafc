// Package limits answers how far each supply, the ambient temperature and the load
// may go before a circuit no longer holds what it is to hold, and why it ends
// there.
//
// From the nominal point the branch is followed along each axis, to both sides. The
// margin to the band is an event of the walk, never a grid point, and a fold, where
// the branch turns back and there is no such point beyond, is one answer.
package limits

import (
	"errors"
	"fmt"
	"math"
	"sync"

	"biaswright/netlist"
	"biaswright/netlist/quantity"
	"biaswright/solve"
	"biaswright/solve/follow"
	"biaswright/solve/mna"
)

// Options steer a search.
type Options struct {
	// Within, where set, replaces the width of the hold.
	Within *Within
	// Near, where set, chooses among several nominal points, as solve.Options does.
	Near map[netlist.NodeID]float64
	// NoCounts leaves out how many emitters may stand in a row, which takes as long
	// as all the rest.
	NoCounts bool
	// Workers is how many axes are followed and conditions counted at a time; 0 is one.
	// The answer is the same.
	Workers int
}

// Within is a width: a fraction of the nominal value, or in the quantity's unit.
type Within struct {
	Value    float64
	Relative bool
}

// An Answer is all that was found.
type Answer struct {
	Nominal    *solve.Point
	Hold       Hold
	Limits     []Limit
	Regulation []Regulation
	Load       *Load // nil without a declared load
}

// Hold is the regulated quantity with its band, in its unit.
type Hold struct {
	Q                  *netlist.Expr
	Nominal, Low, High float64
}

// A Limit is how far one axis may go, the others at nominal.
type Limit struct {
	Axis    string // "VCC.V", "ambient", "load.V"
	Unit    quantity.Unit
	Nominal float64
	From    float64 // the range of the search
	To      float64
	Low     Side // algebraically
	High    Side
	// Headroom is how far a supply may still fall towards 0 from nominal, and the
	// load's voltage rise; NaN where it may go all the way, and for the ambient.
	Headroom float64
}

// A Reason is why a search ended.
type Reason string

// The reasons.
const (
	Band Reason = "band" // the quantity left its band
	Fold Reason = "fold" // the branch turns back: no such point beyond
	End  Reason = "end"  // searched to the end, still holds
	// Lost: holds as far as the branch could be followed; nothing is known beyond.
	Lost Reason = "lost"
)

// A Side is one side of an axis.
type Side struct {
	// At is the last value that holds, NaN where the search met no limit.
	At         float64
	Reason     Reason
	SearchedTo float64
	Cause      Cause
	// Point is the circuit at At; nil without a limit.
	Point *solve.Point
}

// Limited tells that the search met a limit.
func (s *Side) Limited() bool { return s.Reason == Band || s.Reason == Fold }

// HoldsTo is the limit, or how far was searched where there is none.
func (s *Side) HoldsTo() float64 {
	if s.Limited() {
		return s.At
	}
	return s.SearchedTo
}

// Errors that a file can mend.
var (
	ErrNoHold   = errors.New("nothing is held: the file has neither hold nor target")
	ErrZeroHold = errors.New("the held quantity is 0 at the nominal point, and a band relative to it is empty")
)

// Find searches every axis of a circuit. The error is ErrNoHold, ErrZeroHold, a
// *solve.Failure where there is no nominal point, or says what went wrong on the
// way.
func Find(c *netlist.Circuit, o Options) (*Answer, error) {
	q, within, relative := solve.HoldOf(c)
	if o.Within != nil {
		within, relative = o.Within.Value, o.Within.Relative
	}
	if q == nil {
		return nil, ErrNoHold
	}
	res, err := solve.Solve(c, solve.Options{Near: o.Near})
	if err != nil {
		return nil, err
	}
	a := &Answer{Nominal: res.Point}
	nominal, ok := q.Eval(res.Point)
	if !ok {
		return nil, fmt.Errorf("%s has no number at the nominal point", q.Text)
	}
	width := within
	if relative {
		if width = within * math.Abs(nominal); width == 0 {
			return nil, ErrZeroHold
		}
	}
	a.Hold = Hold{q, nominal, nominal - width, nominal + width}
	if err := a.search(c, max(o.Workers, 1)); err != nil {
		return nil, err
	}
	if err := a.regulate(c); err != nil {
		return nil, err
	}
	if len(c.Load) > 0 {
		a.loadAnswers(c, !o.NoCounts, max(o.Workers, 1))
	}
	return a, nil
}

// An axis is what is followed.
type axis struct {
	name      string
	c         *netlist.Circuit // with the load held, for load.V
	start     *solve.Point
	slot      netlist.SlotID
	low, high float64 // searched
}

// search follows every axis; answers come in the order of the axes.
func (a *Answer) search(c *netlist.Circuit, workers int) error {
	axes, err := a.axes(c)
	if err != nil {
		return err
	}
	a.Limits = make([]Limit, len(axes))
	failed := make([]error, len(axes))
	inTurn(len(axes), workers, func(i int) { a.Limits[i], failed[i] = a.limit(&axes[i]) })
	return errors.Join(failed...)
}

// inTurn calls do for 0 to n - 1, at most so many at a time, and waits for all.
func inTurn(n, workers int, do func(i int)) {
	slots := make(chan struct{}, workers)
	var wait sync.WaitGroup
	for i := range n {
		slots <- struct{}{}
		wait.Go(func() {
			defer func() { <-slots }()
			do(i)
		})
	}
	wait.Wait()
}

// The ambient range searched where none wider is stated, in degC: the ordinary
// limits of parts and a little beyond (common practice: -55 to 150).
const coldest, hottest = -55, 150

func (a *Answer) axes(c *netlist.Circuit) ([]axis, error) {
	var out []axis
	for i := range c.Rails {
		r := &c.Rails[i]
		low, high := railRange(c, i)
		out = append(out, axis{r.Name + ".V", c, a.Nominal, r.Volts, low, high})
	}
	s := &c.Slots[c.Ambient]
	low, high := math.Min(coldest, s.Value), math.Max(hottest, s.Value)
	if s.Bounds.Stated {
		low, high = math.Min(low, s.Bounds.Low), math.Max(high, s.Bounds.High)
	}
	out = append(out, axis{"ambient", c, a.Nominal, c.Ambient, low, high})
	if len(c.Load) > 0 {
		held, start, err := a.heldLoad(c)
		if err != nil {
			return nil, err
		}
		if _, ok := a.Hold.Q.Eval(start); ok { // else what is held is the load's own voltage
			bottom, top := span(c)
			volts := a.Nominal.LoadV
			out = append(out, axis{netlist.LoadName, held, start, held.LoadVolts, math.Min(0, volts), math.Max(top-bottom, volts)})
		}
	}
	return out, nil
}

// heldLoad is the circuit with an ideal voltage in the load's place, at the point
// that it has nominally.
func (a *Answer) heldLoad(c *netlist.Circuit) (*netlist.Circuit, *solve.Point, error) {
	held := c.HoldLoad(a.Nominal.LoadV)
	res, err := solve.Solve(held, solve.Options{Near: a.nominalVolts()})
	if err != nil {
		return nil, nil, fmt.Errorf("with the load held at its nominal voltage: %w", err)
	}
	return held, res.Point, nil
}

// railRange is how far a rail is searched: to 0, and away from it to the larger of
// twice nominal and its stated bound; a rail of 0 V both ways, to the span of the
// others.
func railRange(c *netlist.Circuit, rail int) (low, high float64) {
	s := &c.Slots[c.Rails[rail].Volts]
	v := s.Value
	if v == 0 {
		bottom, top := span(c)
		low, high = -(top - bottom), top-bottom
	} else {
		low, high = math.Min(0, 2*v), math.Max(0, 2*v)
	}
	if s.Bounds.Stated {
		low, high = math.Min(low, s.Bounds.Low), math.Max(high, s.Bounds.High)
	}
	return low, high
}

// span is the lowest and the highest voltage of the rails and gnd.
func span(c *netlist.Circuit) (low, high float64) {
	for i := range c.Rails {
		v := c.Value(c.Rails[i].Volts)
		low, high = math.Min(low, v), math.Max(high, v)
	}
	return low, high
}

func (a *Answer) limit(ax *axis) (Limit, error) {
	l := Limit{Axis: ax.name, Unit: ax.c.Slots[ax.slot].Unit, Nominal: ax.c.Value(ax.slot), From: ax.low, To: ax.high, Headroom: math.NaN()}
	var err error
	if l.Low, err = a.side(ax, -1); err != nil {
		return l, err
	}
	if l.High, err = a.side(ax, +1); err != nil {
		return l, err
	}
	worse := l.Low // a supply runs short, a load takes more
	if l.Nominal < 0 || ax.name == netlist.LoadName {
		worse = l.High
	}
	if ax.name != "ambient" && worse.Limited() {
		l.Headroom = math.Abs(l.Nominal - worse.At)
	}
	return l, nil
}

// side follows the branch to one side until the margin is gone.
func (a *Answer) side(ax *axis, direction int) (Side, error) {
	end := ax.high
	if direction < 0 {
		end = ax.low
	}
	side := Side{At: math.NaN(), Reason: End, SearchedTo: end}
	from := ax.c.Value(ax.slot)
	if from == end {
		return side, nil
	}
	s, err := mna.New(ax.c)
	if err != nil {
		return side, err
	}
	width := math.Abs(end - from)
	watch := a.newWatch(s, ax.slot)
	w := follow.Follow(s.Numbers(s.NewTuner(ax.slot), width), ax.start.Unknowns(), from, follow.Options{
		Mode: follow.ArcLength, Direction: direction, StopAtFold: true, LambdaScale: width,
		Low: math.Min(from, end), High: math.Max(from, end),
		Events: []follow.Event{{Margin: watch.margin, Stop: true}},
	})
	switch {
	case len(w.Crossings) > 0:
		side.Reason, side.At = Band, w.Crossings[0].Lambda
		side.Point = watch.point(w.Crossings[0].X, side.At)
	case len(w.Folds) > 0:
		side.Reason, side.At = Fold, w.Folds[0].Lambda
		side.Point = watch.point(w.Folds[0].X, side.At)
	case w.Outcome == follow.RangeEnd:
		return side, nil
	default:
		side.Reason, side.SearchedTo = Lost, w.Lambda
		return side, nil
	}
	side.SearchedTo = side.At
	side.Cause = a.explain(ax, side)
	return side, nil
}

// A watch evaluates the held quantity on a system of its own, so that the walk's
// is left alone.
type watch struct {
	a     *Answer
	s     *mna.System
	t     *mna.Tuner
	state *mna.State
}

func (a *Answer) newWatch(s *mna.System, slot netlist.SlotID) *watch {
	own := s.Clone()
	return &watch{a: a, s: own, t: own.NewTuner(slot)}
}

// margin is how far inside its band the quantity is, over half the band's width.
func (w *watch) margin(x []float64, lambda float64) float64 {
	w.t.Set(lambda)
	if w.state == nil {
		w.state = w.s.StateAt(x)
	} else {
		w.state.Refresh(x)
	}
	h := &w.a.Hold
	v, ok := h.Q.Eval(w.state)
	if !ok {
		return -1
	}
	return 2 * math.Min(v-h.Low, h.High-v) / (h.High - h.Low)
}

func (w *watch) point(x []float64, lambda float64) *solve.Point {
	w.t.Set(lambda)
	return solve.PointAt(w.s, x, "followed")
}
