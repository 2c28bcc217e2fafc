// Package hand holds a hand calculation against the full solution, and says where the
// difference comes from.
//
// A file's assume lines idealise the circuit; its hand lines are formulas. Between the
// two stands the circuit itself, solved with every assumption in force: what it differs
// from the formula is what the formula left out. The rest, from there to the full
// solution, is shared out among the assumptions: each one's share is what replacing it
// by the real model changes, averaged over all orders of replacing them (the Shapley
// value; L. S. Shapley, A value for n-person games, 1953). With v(S) the quantity where
// the assumptions S hold, of k,
//
//	share(i) = Σ over S without i of |S|! (k-1-|S|)!/k! (v(S) - v(S with i)),
//
// so that the shares add up to full - idealised and depend on no order. All 2^k circuits
// are solved.
//
// What an assumption idealises:
//
//   - Vbe, drop, Vz: the junction, with any bulk resistance beside it, stands at that
//     voltage whatever it carries: the limit of a junction ever steeper (see
//     devices.FixedDrop), extrapolated from finite steepness. Both junctions of a
//     transistor are steepened, so that one in saturation has V_CE = 0; its Early factor
//     keeps the true v_BC. Its base current remains the same function of its collector
//     current. No temperature moves a fixed drop.
//   - betaF: the base current of forward operation is I_f over that number: Irec and
//     betaDrift go too. Infinite, no base current is left but the collector junction's.
//   - betaR, VA: that number in every transistor.
//   - ambient: every part and resistor at that temperature.
//
// Rules of thumb are tested on the full solution, and what each is about is taken away
// to see what it costs. Measured values are compared with the full solution; where they
// differ, the value whose change alone would explain most of them is found by least
// squares of the relative differences.
package hand

import (
	"errors"
	"fmt"
	"math"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
)

// Options steer a check. The zero value is the ordinary one.
type Options struct {
	// Near, where set, chooses among several operating points, as solve.Options does.
	Near map[netlist.NodeID]float64
}

// An Answer is a hand calculation checked.
type Answer struct {
	Circuit *netlist.Circuit
	Full    *solve.Point
	// Players are the assumptions, in file order, that the difference is shared out
	// among. Merged tells that there were too many, and that those on single parts
	// stand as one.
	Players []Player
	Merged  bool
	// Unsplit says why the difference is not shared out: a combination of assumptions
	// leaves no operating point. It is nil where it is shared out.
	Unsplit error
	Rows    []Row
	Rules   []Rule
	// Suspects are the parameters whose change alone would explain most of what is
	// measured, the best first; empty where all that is measured agrees.
	Suspects []Suspect
	// Verdicts are the targets at the full solution, in file order.
	Verdicts []solve.Verdict
}

// A Player is one assumption, or several merged.
type Player struct {
	Text  string // "Vbe", "drop(sig)", "fixed drops"
	Items []int  // indices into Circuit.Assumed
	// Findings are the full solution's figures behind it, item by item.
	Findings []Finding
}

// A Row is one quantity: the hand lines' in file order, then what else is measured,
// then what else has a target. Numbers are in the quantity's unit, NaN where there is
// none.
type Row struct {
	Q    *netlist.Expr
	Unit string
	// HandLine is the index into Circuit.Hands, MeasuredLine into Circuit.Measured,
	// Target into Verdicts; netlist.None without one.
	HandLine, MeasuredLine, Target int

	Hand     float64 // what the formula gives
	Ideal    float64 // the circuit with every assumption in force
	Full     float64 // the full solution
	Measured float64
	// Agreement is the measured value's with the model; "" without one.
	Agreement Agreement
	// Shares are the players' of Full - Ideal; nil without a split.
	Shares []float64
}

// LeftOut is what the formula left out of the circuit that it idealises.
func (r *Row) LeftOut() float64 { return r.Ideal - r.Hand }

// InBand tells whether a value of the row meets its target; ok is false without a
// target or a value.
func (a *Answer) InBand(r *Row, value float64) (in, ok bool) {
	if r.Target == netlist.None || math.IsNaN(value) {
		return false, false
	}
	v := &a.Verdicts[r.Target]
	return value >= v.Low && value <= v.High, true
}

// An Error is what a file can mend.
type Error struct {
	Code, Message, Hint string
	Span                diag.Span
}

func (e *Error) Error() string { return e.Message }

// Check checks a circuit's hand calculation. The error is an *Error where the file must
// be mended, a *solve.Failure where the circuit has no operating point, or says what
// went wrong.
func Check(c *netlist.Circuit, o Options) (*Answer, error) {
	if len(c.Hands) == 0 {
		return nil, &Error{
			Code: "no-hand", Span: diag.Span{File: c.File}, Message: "there is no hand calculation to check",
			Hint: "add what it says, such as: hand Q1.Ic = 0.7 V / RE, and on an assume line what it idealises",
		}
	}
	res, err := solve.Solve(c, solve.Options{Near: o.Near})
	if err != nil {
		return nil, err
	}
	a := &Answer{Circuit: c, Full: res.Point, Verdicts: targets(res.Point)}
	a.Rows = rowsOf(a)
	if err := a.hands(); err != nil {
		return nil, err
	}
	a.Players, a.Merged = players(c)
	for i := range a.Players {
		for _, item := range a.Players[i].Items {
			a.Players[i].Findings = append(a.Players[i].Findings, findings(a.Full, item)...)
		}
	}
	a.split()
	a.Rules = a.rules()
	if err := a.measured(); err != nil {
		return nil, err
	}
	return a, nil
}

// targets are the verdicts on targets alone.
func targets(p *solve.Point) []solve.Verdict {
	return solve.Judge(p, nil)[:len(p.Circuit.Targets)] // targets come first
}

func rowsOf(a *Answer) []Row {
	c := a.Circuit
	var rows []Row
	at := map[string]int{}
	row := func(q *netlist.Expr) *Row {
		i, ok := at[q.Text]
		if !ok {
			full, _ := q.Eval(a.Full)
			rows = append(rows, Row{
				Q: q, Unit: q.Unit.Symbol(), HandLine: netlist.None, MeasuredLine: netlist.None, Target: netlist.None,
				Hand: math.NaN(), Ideal: math.NaN(), Full: full, Measured: math.NaN(),
			})
			i = len(rows) - 1
			at[q.Text] = i
		}
		return &rows[i]
	}
	for i := range c.Hands {
		row(c.Hands[i].Q).HandLine = i
	}
	for i := range c.Measured {
		r := row(c.Measured[i].Q)
		r.MeasuredLine, r.Measured = i, c.Measured[i].Value
	}
	for i := range c.Targets {
		row(c.Targets[i].Q).Target = i
	}
	return rows
}

// handEnv is the hand calculation as an environment: a quantity is its own hand line's.
type handEnv struct {
	c    *netlist.Circuit
	line map[string]*netlist.Hand
}

func (h *handEnv) Slot(id netlist.SlotID) float64 { return h.c.Value(id) }

func (h *handEnv) Quantity(r netlist.Ref) (float64, bool) {
	line, ok := h.line[r.Text]
	if !ok {
		return math.NaN(), false
	}
	return line.Value.Eval(h)
}

// hands evaluates the hand lines.
func (a *Answer) hands() error {
	c := a.Circuit
	env := &handEnv{c: c, line: map[string]*netlist.Hand{}}
	for i := range c.Hands {
		env.line[c.Hands[i].Q.Text] = &c.Hands[i]
	}
	for i := range a.Rows {
		r := &a.Rows[i]
		if r.HandLine == netlist.None {
			continue
		}
		h := &c.Hands[r.HandLine]
		value, ok := h.Value.Eval(env)
		if !ok || math.IsInf(value, 0) {
			return &Error{Code: "no-number", Span: h.Value.Span, Message: fmt.Sprintf("%s has no number here", h.Value.Text)}
		}
		r.Hand = value
	}
	return nil
}

// MostPlayers is how many assumptions are weighed singly: 2^10 circuits are solved in
// about a second. Where there are more, those on single parts become one.
const MostPlayers = 10

// players groups the assumptions.
func players(c *netlist.Circuit) (list []Player, merged bool) {
	for i := range c.Assumed {
		list = append(list, Player{Text: AssumedName(c, i), Items: []int{i}})
	}
	if len(list) <= MostPlayers {
		return list, false
	}
	one := Player{Text: "drops of single parts"}
	list = list[:0]
	for i := range c.Assumed {
		if c.Assumed[i].Part == netlist.None {
			list = append(list, Player{Text: AssumedName(c, i), Items: []int{i}})
			continue
		}
		one.Items = append(one.Items, i)
	}
	return append(list, one), true
}

// AssumedName is an assumption's key as the file writes it: "Vbe", "drop(sig)".
func AssumedName(c *netlist.Circuit, item int) string {
	a := &c.Assumed[item]
	if a.Part == netlist.None {
		return a.Key
	}
	return a.Key + "(" + c.Parts[a.Part].Name + ")"
}

// split solves the circuit under every combination of the assumptions, and shares the
// difference out.
func (a *Answer) split() {
	k := len(a.Players)
	all := 1<<k - 1
	values := make([][]float64, all+1) // by combination, by row
	// All of them first: what the formulas left out is told even if some others fail.
	for i := range values {
		set := all - i
		v, err := a.under(set)
		if err != nil {
			a.Unsplit = fmt.Errorf("with %s assumed, %w", a.names(set), err)
			break
		}
		values[set] = v
	}
	for i := range a.Rows {
		r := &a.Rows[i]
		if values[all] != nil {
			r.Ideal = values[all][i]
		}
		if a.Unsplit == nil {
			r.Shares = shapley(k, func(set int) float64 { return values[set][i] })
		}
	}
}

// shapley gives each of k players its share of v(none) - v(all), averaged over all
// orders in which they may leave.
func shapley(k int, v func(set int) float64) []float64 {
	factorial := make([]float64, k+1)
	factorial[0] = 1
	for i := 1; i <= k; i++ {
		factorial[i] = factorial[i-1] * float64(i)
	}
	shares := make([]float64, k)
	for set := range 1 << k {
		size := 0
		for i := range k {
			size += set >> i & 1
		}
		for i := range k {
			if set>>i&1 == 0 {
				shares[i] += factorial[size] * factorial[k-1-size] / factorial[k] * (v(set) - v(set|1<<i))
			}
		}
	}
	return shares
}

// names lists the players of a combination.
func (a *Answer) names(set int) string {
	text := ""
	for i := range a.Players {
		if set>>i&1 == 0 {
			continue
		}
		if text != "" {
			text += ", "
		}
		text += a.Players[i].Text
	}
	return text
}

var errNoLimit = errors.New("the currents do not settle as the drops become fixed: perhaps some stand against each other, or straight across a supply")
