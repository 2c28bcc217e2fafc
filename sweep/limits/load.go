package limits

import (
	"math"
	"strconv"
	"sync"

	"biaswright/netlist"
	"biaswright/solve"
)

// A Load is what the load may be.
type Load struct {
	// Low and High are the voltages at the load between which the circuit holds;
	// NaN where what is held is the load's own voltage.
	Low, High float64
	// Outputs are the nodes at the load's ends that no rail holds, with their
	// voltages at both ends of the window.
	Outputs []Output
	// MaxOhms is the largest resistance that may stand in the load's place: the
	// window's larger end over the current there.
	MaxOhms float64
	// Row is the element of the load whose number was counted, "" where the load
	// has no diode or emitter; Counts how many may stand in a row.
	Row    string
	Counts []Count
}

// An Output is a node at the load's end.
type Output struct {
	Node          string
	AtLow, AtHigh float64 // V, at the window's ends
}

// A Count is the largest number in a row that still holds, 0 where not even one
// does, -1 where the search ended before it found the end.
type Count struct {
	Where string // "nominal", "low rails", "coldest", "hottest"
	Most  int
}

// loadAnswers reads the window off the limits, and counts where that is asked for.
func (a *Answer) loadAnswers(c *netlist.Circuit, counts bool, workers int) {
	l := &Load{Low: math.NaN(), High: math.NaN(), MaxOhms: math.NaN()}
	a.Load = l
	for i := range a.Limits {
		if lim := &a.Limits[i]; lim.Axis == netlist.LoadName {
			a.window(c, l, lim)
		}
	}
	if !counts {
		return
	}
	for _, i := range c.Load {
		if c.Elements[i].Kind == netlist.JunctionPart {
			l.Row = c.Elements[i].Name
			a.count(c, l, workers)
			return
		}
	}
}

func (a *Answer) window(c *netlist.Circuit, l *Load, lim *Limit) {
	at := func(s Side) (float64, *solve.Point) {
		if s.Limited() {
			return s.At, s.Point
		}
		held, start, err := a.heldLoad(c)
		if err != nil {
			return s.SearchedTo, nil
		}
		p, err := solve.Onward(held.HoldLoad(s.SearchedTo), start)
		if err != nil {
			return s.SearchedTo, nil
		}
		return s.SearchedTo, p
	}
	var low, high *solve.Point
	l.Low, low = at(lim.Low)
	l.High, high = at(lim.High)
	if high != nil && high.LoadI > 0 {
		l.MaxOhms = l.High / high.LoadI
	}
	first, last := c.Elements[c.Load[0]].From, c.Elements[c.Load[len(c.Load)-1]].To
	for _, node := range []netlist.NodeID{first, last} {
		if low != nil && high != nil && node != netlist.Gnd && c.Nodes[node].Rail == netlist.None {
			l.Outputs = append(l.Outputs, Output{c.Nodes[node].Name, low.NodeV[node], high.NodeV[node]})
		}
	}
}

// count finds the largest number in a row under each condition, by solving each
// circuit.
func (a *Answer) count(c *netlist.Circuit, l *Load, workers int) {
	conditions := []struct {
		where string
		ends  []netlist.Setting
	}{{"nominal", nil}, {"low rails", nearestZero(c)}, {"coldest", ambientEnd(c, "low")}, {"hottest", ambientEnd(c, "high")}}
	lots := &lots{c: c, row: l.Row}
	var counts []*counter
	for _, cond := range conditions {
		if cond.where != "nominal" && cond.ends == nil {
			continue // no such range is stated
		}
		counts = append(counts, &counter{a: a, lots: lots, ends: cond.ends, from: a.Nominal})
		l.Counts = append(l.Counts, Count{Where: cond.where})
	}
	inTurn(len(counts), workers, func(i int) { l.Counts[i].Most = counts[i].most() })
}

// A counter counts under one condition.
type counter struct {
	a    *Answer
	lots *lots
	ends []netlist.Setting
	from *solve.Point // the last that was solved
}

// lots are the circuit with so many in a row, made once for all conditions: the nodes
// change, and that is dear.
type lots struct {
	sync.Mutex
	c    *netlist.Circuit
	row  string             // the element of the load
	made []*netlist.Circuit // of 1, 2, ...; nil where such a circuit is refused
}

func (l *lots) of(k int) *netlist.Circuit {
	l.Lock()
	defer l.Unlock()
	for len(l.made) < k {
		c, list := l.c.With(netlist.Setting{Name: l.row + ".row", Value: strconv.Itoa(len(l.made) + 1)})
		if list.HasErrors() {
			c = nil
		}
		l.made = append(l.made, c)
	}
	return l.made[k-1]
}

// longestCount bounds the search; no supply of a bias network drives more.
const longestCount = 200

// most counts up until three more in a row have failed: a band may be entered from
// outside, but is not left and entered again by one more emitter.
func (n *counter) most() int {
	const patience = 3
	most, failed := 0, 0
	for k := 1; k <= longestCount; k++ {
		// Each is solved from the one before; the first that fails is asked again from
		// nothing, in case the branch was lost.
		if n.holds(k, false) || failed == 0 && n.holds(k, true) {
			most, failed = k, 0
			continue
		}
		if failed++; failed >= patience && (most > 0 || k > 2*patience) {
			return most
		}
	}
	return -1
}

// holds tells whether so many hold what is held, solved from the point before or anew.
func (n *counter) holds(k int, anew bool) bool {
	c := n.lots.of(k)
	if c != nil && n.ends != nil {
		c, _ = c.At(n.ends...) // nil where it is refused
	}
	if c == nil {
		return false
	}
	var p *solve.Point
	var err error
	if anew {
		p, err = cold(c)
	} else {
		p, err = solve.Onward(c, n.from)
	}
	if err != nil || p.Unstable {
		return false
	}
	n.from = p
	q, list := c.ParseExpr(n.a.Hold.Q.Text)
	if list.HasErrors() {
		return false
	}
	v, ok := q.Eval(p)
	return ok && v >= n.a.Hold.Low && v <= n.a.Hold.High
}

func cold(c *netlist.Circuit) (*solve.Point, error) {
	res, err := solve.Solve(c, solve.Options{})
	if err != nil {
		return nil, err
	}
	return res.Point, nil
}

// nearestZero puts every rail with a stated range at its end nearest 0.
func nearestZero(c *netlist.Circuit) []netlist.Setting {
	var out []netlist.Setting
	for i := range c.Rails {
		b := &c.Slots[c.Rails[i].Volts].Bounds
		if !b.Stated {
			continue
		}
		end := "low"
		if math.Abs(b.High) < math.Abs(b.Low) {
			end = "high"
		}
		out = append(out, netlist.Setting{Name: c.Rails[i].Name, Value: end})
	}
	return out
}

func ambientEnd(c *netlist.Circuit, end string) []netlist.Setting {
	if !c.Slots[c.Ambient].Bounds.Stated {
		return nil
	}
	return []netlist.Setting{{Name: "ambient", Value: end}}
}
