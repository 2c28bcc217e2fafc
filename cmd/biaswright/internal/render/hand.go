package render

import (
	"cmp"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
	"biaswright/sweep/hand"
)

// A HandAnswer is what the handcheck command has to show of one file.
type HandAnswer struct {
	File     string
	Circuit  *netlist.Circuit
	Set      []netlist.Setting
	Hand     *hand.Answer // nil with a Failure
	Failure  *solve.Failure
	Warnings diag.List
}

// HandScreen prints the answer for people.
func HandScreen(w io.Writer, a *HandAnswer, l Look) error {
	p := &writer{w: w}
	printTitle(p, &Answer{File: a.File, Circuit: a.Circuit, Set: a.Set}, l)
	if a.Failure != nil {
		printFailure(p, a.Failure, l)
		return p.err
	}
	found := a.Hand
	printHands(p, found, l)
	if rows := sharedOut(found); len(rows) > 0 {
		fmt.Fprintln(p)
		printShares(p, found, rows, l)
	}
	if found.Unsplit != nil {
		fmt.Fprintln(p)
		wrap(p, "", l.text(UnsplitText(found)))
	}
	if found.Merged && found.Unsplit == nil {
		wrap(p, "  ", l.text(MergedText(found)))
	}
	if len(found.Rules) > 0 {
		fmt.Fprintln(p)
		printRules(p, found, l)
	}
	if says := MeasuredTexts(found); len(says) > 0 {
		fmt.Fprintln(p)
		fmt.Fprintln(p, l.paint("Measured", bold))
		for _, text := range says {
			wrap(p, "  ", l.text(text))
		}
	}
	return p.err
}

// UnsplitText says why the difference is not shared out.
func UnsplitText(a *hand.Answer) string {
	return "The difference cannot be shared out: " + a.Unsplit.Error() + "."
}

// MergedText says which assumptions stand as one.
func MergedText(a *hand.Answer) string {
	var names []string
	for _, item := range a.Players[len(a.Players)-1].Items {
		names = append(names, hand.AssumedName(a.Circuit, item))
	}
	return fmt.Sprintf("More than %d assumptions: %s are weighed as one.", hand.MostPlayers, strings.Join(names, ", "))
}

// The columns of the hand calculation.
const (
	hndQuantity = iota
	hndHand
	hndFull
	hndDifference
	hndPercent
	hndMeasured
	hndOff
	hndTarget
	hndCols
)

func printHands(w io.Writer, a *hand.Answer, l Look) {
	t := table{numeric: make([]bool, hndCols), most: make([]int, hndCols)}
	for _, i := range []int{hndHand, hndFull, hndDifference, hndPercent, hndMeasured, hndOff} {
		t.numeric[i] = true
	}
	heads := map[int]string{hndHand: "by hand", hndFull: "in full", hndPercent: "off", hndDifference: "difference"}
	if slices.ContainsFunc(a.Rows, func(r hand.Row) bool { return r.MeasuredLine != netlist.None }) {
		heads[hndMeasured], heads[hndOff] = "measured", "off full"
	}
	if len(a.Verdicts) > 0 {
		heads[hndTarget] = "target"
	}
	h := make([]cell, hndCols)
	h[hndQuantity] = cell{"Hand calculation", bold}
	for i, what := range heads {
		h[i] = cell{what, faint}
	}
	t.add(row{head: true, cells: h})
	for i := range a.Rows {
		t.add(row{cells: handCells(a, &a.Rows[i], l)})
	}
	t.print(w, l)
	for i := range a.Rows {
		if says := BandText(a, &a.Rows[i]); says != "" {
			wrap(w, "  ", l.text(says))
		}
	}
}

func handCells(a *hand.Answer, r *hand.Row, l Look) []cell {
	cells := make([]cell, hndCols)
	put := func(at int, text string) { cells[at] = cell{l.text(text), noInk} }
	put(hndQuantity, "  "+r.Q.Text)
	value := func(at int, x float64) {
		if !math.IsNaN(x) {
			put(at, Measured(x, r.Unit))
		}
	}
	value(hndHand, r.Hand)
	value(hndFull, r.Full)
	if d := r.Full - r.Hand; !math.IsNaN(d) {
		put(hndDifference, signedMeasured(trimmed(r, d), r.Unit))
		put(hndPercent, signedPercent(d/math.Abs(r.Hand)))
	}
	value(hndMeasured, r.Measured)
	if d := r.Measured - r.Full; !math.IsNaN(d) {
		put(hndOff, signedPercent(d/math.Abs(r.Full)))
	}
	if in, ok := a.InBand(r, r.Full); ok && in {
		cells[hndTarget] = cell{"met", good}
	} else if ok {
		cells[hndTarget] = cell{"NOT MET", bad}
	}
	return cells
}

// BandText says by how much a target is missed in full, and whether the hand
// calculation had seen it; "" where both meet it or there is none.
func BandText(a *hand.Answer, r *hand.Row) string {
	in, ok := a.InBand(r, r.Full)
	handIn, handOk := a.InBand(r, r.Hand)
	if !ok || in && (handIn || !handOk) {
		return ""
	}
	v := &a.Verdicts[r.Target]
	f := figuresOf(v, r.Unit)
	says := fmt.Sprintf("%s: %s allowed, ", r.Q.Text, f.allowed(v))
	switch {
	case in:
		return says + "met in full, though the hand calculation is outside"
	case handOk && handIn:
		return says + f.margin(-v.Margin) + " beyond, and the hand calculation does not see it"
	default:
		return says + f.margin(-v.Margin) + " beyond"
	}
}

// signedMeasured is Measured with its sign.
func signedMeasured(x float64, unit string) string {
	if x > 0 {
		return "+" + Measured(x, unit)
	}
	return Measured(x, unit)
}

// signedPercent writes a fraction as a percentage of one decimal, or of two digits
// below 0.1 %: no hand calculation is known to more.
func signedPercent(x float64) string {
	const toPercent, one, least = 100, 0.1, 0.001
	x *= toPercent
	switch size := math.Abs(x); {
	case math.IsNaN(x) || math.IsInf(x, 0):
		return "-"
	case size < least:
		return "0 %"
	case size < one:
		return fmt.Sprintf("%+.2g %%", x)
	default:
		return fmt.Sprintf("%+.1f %%", x)
	}
}

// shareText writes a part of a row's difference in percent of the hand calculation's
// figure, under a heading that says so; of a figure of 0, the amount itself.
func shareText(r *hand.Row, amount float64) string {
	if r.Hand == 0 {
		return signedMeasured(amount, r.Unit)
	}
	return strings.TrimSuffix(signedPercent(amount/math.Abs(r.Hand)), " %")
}

// sharedOut are the hand lines' rows that have an idealised value.
func sharedOut(a *hand.Answer) []*hand.Row {
	var rows []*hand.Row
	for i := range a.Rows {
		if r := &a.Rows[i]; r.HandLine != netlist.None && !math.IsNaN(r.Ideal) {
			rows = append(rows, r)
		}
	}
	return rows
}

// printShares prints where the differences come from, in percent of what the hand
// calculation says: a line an assumption, a column a quantity.
func printShares(w io.Writer, a *hand.Answer, rows []*hand.Row, l Look) {
	fmt.Fprintln(w, l.paint("Where it comes from", bold)+l.paint(", in % of what the hand calculation says", faint))
	const abreast = 5 // columns that leave room for the words
	for len(rows) > abreast {
		printShareBlock(w, a, rows[:abreast], l)
		fmt.Fprintln(w)
		rows = rows[abreast:]
	}
	printShareBlock(w, a, rows, l)
}

func printShareBlock(w io.Writer, a *hand.Answer, rows []*hand.Row, l Look) {
	t := table{numeric: make([]bool, len(rows)), most: make([]int, len(rows))}
	head := row{head: true}
	says := []string{leftOutText(rows)}
	for i, r := range rows {
		t.numeric[i] = true
		head.cells = append(head.cells, cell{l.text(r.Q.Text), noInk})
	}
	t.add(head)
	line := func(amount func(r *hand.Row) float64) {
		var cells []cell
		for _, r := range rows {
			cells = append(cells, cell{l.text(shareText(r, trimmed(r, amount(r)))), noInk})
		}
		t.add(row{cells: cells})
	}
	line((*hand.Row).LeftOut)
	for i := range a.Players {
		if a.Unsplit == nil {
			says = append(says, PlayerText(a, &a.Players[i]))
			line(func(r *hand.Row) float64 { return r.Shares[i] })
		}
	}
	if a.Unsplit != nil {
		says = append(says, "the assumptions together")
		line(func(r *hand.Row) float64 { return r.Full - r.Ideal })
	}
	says = append(says, "in all")
	line(func(r *hand.Row) float64 { return r.Full - r.Hand })
	var out strings.Builder
	uncoloured := l
	uncoloured.Colour = false // its widths are measured
	t.print(&out, uncoloured)
	lines := strings.Split(strings.TrimRight(out.String(), "\n"), "\n")
	widest := 0
	for _, text := range lines {
		widest = max(widest, width(text))
	}
	fmt.Fprintln(w, "  "+l.paint(lines[0], faint))
	for i, text := range lines[1:] {
		wrap(w, "  "+text+strings.Repeat(" ", widest-width(text)+gap), l.text(says[i]))
	}
}

// leftOutText says what the formulas left out of the circuit that they idealise.
func leftOutText(rows []*hand.Row) string {
	var says []string
	for _, r := range rows {
		if trimmed(r, r.LeftOut()) != 0 {
			says = append(says, r.Q.Text+" "+Measured(trimmed(r, r.Ideal), r.Unit))
		}
	}
	if len(says) == 0 {
		return "what the formula left out of the idealised circuit: nothing"
	}
	return "what the formula left out: the idealised circuit has " + strings.Join(says, ", ")
}

// trimmed is an amount of a row, 0 where it is no more than the extrapolation to fixed
// drops may leave.
func trimmed(r *hand.Row, x float64) float64 {
	const rounding = 1e-5
	if math.Abs(x) <= rounding*math.Max(math.Abs(r.Full), math.Abs(r.Hand)) {
		return 0
	}
	return x
}

// PlayerText says what an assumption is against the full solution.
func PlayerText(a *hand.Answer, p *hand.Player) string {
	var says []string
	for _, item := range p.Items {
		says = append(says, hand.AssumedName(a.Circuit, item)+": "+assumedText(a, p, item))
	}
	return strings.Join(says, "; ")
}

// assumedText says what one assumption's figures are.
func assumedText(a *hand.Answer, p *hand.Player, item int) string {
	as := &a.Circuit.Assumed[item]
	var figures []hand.Finding
	for _, f := range p.Findings {
		if f.Item == item {
			figures = append(figures, f)
		}
	}
	if len(figures) == 0 {
		return "nothing conducts that it speaks of"
	}
	least, most := figures[0], figures[0]
	for _, f := range figures {
		if f.Real < least.Real {
			least = f
		}
		if f.Real > most.Real {
			most = f
		}
	}
	name := func(f hand.Finding) string { return a.Circuit.Elements[f.Element].Name }
	switch as.Key {
	case "Vbe":
		return "V_BE is " + fromTo(least.Real, most.Real, "V") + ", not " + stated(as.Value, "V")
	case "drop":
		return "the drop is " + fromTo(least.Real, most.Real, "V") + ", not " + stated(as.Value, "V")
	case "Vz":
		return "it stands at " + fromTo(least.Real, most.Real, "V") + ", not " + stated(as.Value, "V")
	case "betaF":
		if math.IsInf(as.Value, 1) {
			return basesText(a, figures)
		}
		return "I_C/I_B is " + fromTo(least.Real, most.Real, "") + ", not " + stated(as.Value, "")
	case "VA":
		if len(figures) == 1 {
			return "the Early effect, " + signedPercent(most.Real) + " of " + name(most) + "'s current"
		}
		return "the Early effect, " + signedPercent(least.Real) + " (" + name(least) + ") to " + signedPercent(most.Real) + " (" + name(most) + ") of a transistor's current"
	case "betaR":
		return "the collector junction's share of the base current is " + percentOf(most.Real) + " at most, at " + name(most)
	default:
		return "it is " + stated(most.Real, "°C") + ", not " + stated(as.Value, "°C")
	}
}

// fromTo writes one figure, or the least and the most.
func fromTo(least, most float64, unit string) string {
	write := func(x float64) string { return With(x, unit) } // 0.6500 V: the trade writes no mV there
	low, high := write(least), write(most)
	if low == high {
		return low
	}
	return low + " to " + high
}

func percentOf(x float64) string { return strings.TrimPrefix(signedPercent(x), "+") }

// basesText says what the bases take, and from what.
func basesText(a *hand.Answer, figures []hand.Finding) string {
	sum := 0.0
	largest := figures[0]
	for _, f := range figures {
		sum += f.Real
		if f.Real > largest.Real {
			largest = f
		}
	}
	const leakage = 1e-9 // of the circuit's largest current: beta is infinite already
	if math.Abs(sum) < leakage*a.Full.LargestCurrent() {
		return "no base current is left to leave out"
	}
	e := &a.Circuit.Elements[largest.Element]
	verb, from := "takes", "off "
	if sense := a.Circuit.Parts[e.Part].Kind.PNP; sense {
		verb, from = "gives", "into "
	}
	place := from + feedText(a, e.Base)
	if len(figures) == 1 {
		return fmt.Sprintf("%s's base current %s %s %s", e.Name, verb, Measured(largest.Real, "A"), place)
	}
	return fmt.Sprintf("the base currents are %s together; most is %s's, which %s %s %s", Measured(sum, "A"), e.Name, verb, Measured(largest.Real, "A"), place)
}

// feedText names what a base hangs on.
func feedText(a *hand.Answer, node netlist.NodeID) string {
	name := a.Circuit.Nodes[node].Name
	for i := range a.Rules {
		r := &a.Rules[i]
		switch {
		case r.Node != node:
		case r.Kind == hand.Stiffness:
			return "the divider at " + name
		case r.Kind == hand.Reference:
			return "the reference at " + name
		}
	}
	return name
}

// printRules prints the rules of thumb: each one's figure, and what it costs here.
// Transistors well out of saturation, where it costs nothing, share a line.
func printRules(w io.Writer, a *hand.Answer, l Look) {
	fmt.Fprintln(w, l.paint("Rules of thumb", bold))
	line := func(kept bool, says string) {
		mark, kind := "kept  ", good
		if !kept {
			mark, kind = "BROKEN", bad
		}
		var text strings.Builder
		wrap(&text, "  "+mark+"  ", l.text(says))
		io.WriteString(w, strings.Replace(text.String(), mark, l.paint(mark, kind), 1))
	}
	var spare []*hand.Rule
	for i := range a.Rules {
		r := &a.Rules[i]
		if r.Kind == hand.Saturation && r.Kept() && costText(a, r) == costsNothing {
			spare = append(spare, r)
			continue
		}
		line(r.Kept(), RuleText(a, r))
	}
	switch len(spare) {
	case 0:
	case 1:
		line(true, RuleText(a, spare[0]))
	default:
		least := slices.MinFunc(spare, func(x, y *hand.Rule) int { return cmp.Compare(x.Figure, y.Figure) })
		line(true, RuleText(a, least)+"; "+count(len(spare)-1, "other transistor")+" "+have(len(spare)-1)+" more to spare")
	}
}

func have(n int) string {
	if n == 1 {
		return "has"
	}
	return "have"
}

// RuleText says a rule's figure, what is asked for, and what it costs here.
func RuleText(a *hand.Answer, r *hand.Rule) string {
	name := a.Circuit.Elements[r.Element].Name
	var says string
	switch r.Kind {
	case hand.Stiffness:
		says = fmt.Sprintf("%s's divider at %s: beta RE, %s × %s, is %s times its %s (rule: %s or more); the base current", name, a.Circuit.Nodes[r.Node].Name,
			number(r.Beta), Measured(r.Emitter, "Ω"), number(r.Figure), Measured(r.Divider, "Ω"), stated(r.Wanted, ""))
	case hand.Reference:
		var bases []string
		for _, b := range r.Bases {
			bases = append(bases, a.Circuit.Elements[b].Name)
		}
		says = fmt.Sprintf("%s's %s at %s is %s times the base current there, %s of %s (rule: %s or more); the base current", name, Measured(r.Amps, "A"), a.Circuit.Nodes[r.Node].Name,
			number(r.Figure), Measured(r.Base, "A"), strings.Join(bases, ", "), stated(r.Wanted, ""))
	case hand.Switch:
		return fmt.Sprintf("%s is on, as a switch: I_C is %s times its base current, %s (rule: %s or less)", name, number(r.Figure), Measured(r.Base, "A"), stated(r.Wanted, ""))
	default:
		side := "above"
		if r.Figure < 0 {
			side = "below"
		}
		says = fmt.Sprintf("%s is %s %s the edge of saturation (rule: %s or more above); saturation", name, Measured(math.Abs(r.Figure), "V"), side, stated(r.Wanted, "V"))
	}
	return says + " " + costText(a, r)
}

const costsNothing = "costs nothing here"

// costText says what a rule costs, by the hand lines' quantities.
func costText(a *hand.Answer, r *hand.Rule) string {
	var costs []string
	for i := range a.Rows {
		if a.Rows[i].HandLine == netlist.None || math.IsNaN(r.Costs[i]) {
			continue
		}
		if text := signedPercent(r.Costs[i]); text != "0 %" {
			costs = append(costs, a.Rows[i].Q.Text+" "+text)
		}
	}
	if len(costs) == 0 {
		return costsNothing
	}
	return "costs here: " + strings.Join(costs, ", ")
}

// MeasuredTexts says which measured values the model does not give, and what would
// explain them; nothing without measured values.
func MeasuredTexts(a *hand.Answer) []string {
	names := map[hand.Agreement][]string{}
	for i := range a.Rows {
		r := &a.Rows[i]
		names[r.Agreement] = append(names[r.Agreement], r.Q.Text)
	}
	var says []string
	for _, kind := range []struct {
		agreement hand.Agreement
		says      string
	}{
		{hand.Agrees, "as the model has it, within the 1 % of a hand meter"},
		{hand.Reachable, "not what the nominal model has, but each by itself within the stated tolerances"},
		{hand.Apart, "not what the model has, nor what the stated tolerances reach"},
	} {
		if of := names[kind.agreement]; len(of) > 0 {
			says = append(says, strings.Join(of, ", ")+": "+kind.says)
		}
	}
	if len(names[hand.Reachable])+len(names[hand.Apart]) > 0 {
		says = append(says, suspectTexts(a)...)
	}
	return says
}

// suspectTexts names the parameter that explains most, and the next ones.
func suspectTexts(a *hand.Answer) []string {
	if len(a.Suspects) == 0 {
		return []string{"no single value explains any of the differences"}
	}
	best := &a.Suspects[0]
	says := []string{SuspectText(a, best) + fmt.Sprintf(" would explain %.3g %% of the differences", 100*best.Explained)}
	const shown = 4
	var next []string
	for i := 1; i < len(a.Suspects) && i < shown; i++ {
		s := &a.Suspects[i]
		next = append(next, SuspectText(a, s)+fmt.Sprintf(" %.3g %%", 100*s.Explained))
	}
	if len(next) > 0 {
		says = append(says, "next: "+strings.Join(next, "; "))
	}
	return says
}

// SuspectText says what a parameter would have to be, and whether it may.
func SuspectText(a *hand.Answer, s *hand.Suspect) string {
	slot := &a.Circuit.Slots[s.Slot]
	unit := slot.Unit.Symbol()
	where := "no bounds stated"
	if bounded, inside := s.Stated(a.Circuit); inside {
		where = "inside its " + rangeText(slot.Bounds, unit)
	} else if bounded {
		where = "outside its " + rangeText(slot.Bounds, unit)
	}
	return fmt.Sprintf("%s at %s instead of %s (%s)", s.Name, Measured(s.To, unit), stated(s.From, unit), where)
}
