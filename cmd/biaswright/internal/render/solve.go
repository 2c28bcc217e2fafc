package render

import (
	"fmt"
	"io"
	"strings"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
)

// An Answer is what solve has to say about one file.
type Answer struct {
	File    string
	Circuit *netlist.Circuit // as solved: settings and ends taken
	Set, At []netlist.Setting

	Result  *solve.Result // nil where there is a Failure
	Failure *solve.Failure
	// Every is set where all points were asked for; Result is then its. Proof is why the
	// point is the only one, nil where that is not known.
	Every *solve.EveryResult
	Proof *solve.Search
	// Enclosure is of Result's Point; nil where it was not asked for, or with a reason
	// in NoEnclosure.
	Enclosure   *solve.Enclosure
	NoEnclosure string
	// Nominal is the point that a hold is judged against; nil without --at.
	Nominal  *solve.Point
	Verdicts []solve.Verdict
	Cautions []solve.Caution
	// Inner asks for the nodes behind bulk resistances in the JSON form.
	Inner bool
	// Sketch is a picture in characters, printed above all else; nil for none.
	Sketch []string
	// Warnings are about the text; the screen leaves them to standard error.
	Warnings diag.List
}

// Screen prints an answer for people.
func Screen(out io.Writer, a *Answer, l Look) error {
	w := &writer{w: out}
	printTitle(w, a, l)
	if a.Failure != nil {
		printFailure(w, a.Failure, l)
		return w.err
	}
	p := a.Result.Point
	if p.Unstable {
		wrap(w, "", "This point cannot be stable: the circuit would leave it by itself.")
		io.WriteString(w, "\n")
	}
	if a.Every != nil {
		printSearch(w, a.Every, l)
	}
	printSketch(w, a.Sketch, l)
	if a.Every != nil && len(a.Result.Others) > 0 {
		for i, q := range a.Every.All() {
			fmt.Fprintln(w, l.paint(l.text(pointHead(a.Every, i)), bold))
			fmt.Fprintln(w)
			printPoint(w, q, a.Cautions, l)
		}
	} else {
		printPoint(w, p, a.Cautions, l)
	}
	printEnclosure(w, a, l)
	printVerdicts(w, a, l)
	printCautions(w, a.Cautions, l)
	printEvidence(w, a, l)
	return w.err
}

// printPoint prints a point's staircases.
func printPoint(w io.Writer, p *solve.Point, cautions []solve.Caution, l Look) {
	s := newStair(l, p, exceeded(cautions))
	for i := range p.Circuit.Paths {
		s.path(&p.Circuit.Paths[i])
	}
	s.placed()
	s.rails()
	s.t.print(w, l)
	printLoad(w, p, l)
}

// printSketch puts a picture in characters.
func printSketch(w io.Writer, lines []string, l Look) {
	for _, line := range lines {
		fmt.Fprintln(w, l.text(line))
	}
	if len(lines) > 0 {
		fmt.Fprintln(w)
	}
}

// writer remembers the first error, so that printing need not ask each time.
type writer struct {
	w   io.Writer
	err error
}

func (w *writer) Write(b []byte) (int, error) {
	if w.err != nil {
		return 0, w.err
	}
	n, err := w.w.Write(b)
	w.err = err
	return n, err
}

// Under is the line below an answer's title: the file, the ambient temperature, and
// what was set.
func Under(a *Answer) string {
	under := []string{a.File}
	if a.Circuit.Title == "" {
		under = nil
	}
	ambient := a.Circuit.Slots[a.Circuit.Ambient].Value
	under = append(under, "ambient "+stated(ambient, "°C"))
	for _, s := range a.Set {
		under = append(under, s.Name+" = "+s.Value)
	}
	for _, s := range a.At {
		under = append(under, s.Name+" "+s.Value)
	}
	return strings.Join(under, ", ")
}

func printTitle(w io.Writer, a *Answer, l Look) {
	title := a.Circuit.Title
	if title == "" {
		title = a.File
	}
	fmt.Fprintln(w, l.paint(l.text(title), bold))
	wrap(w, "", l.text(Under(a)))
	fmt.Fprintln(w)
}

// printLoad puts the declared load's own figures, where it is more than one
// element; a single one has its line already.
func printLoad(w io.Writer, p *solve.Point, l Look) {
	if len(p.Circuit.Load) < 2 {
		return
	}
	var names []string
	for _, i := range p.Circuit.Load {
		names = append(names, p.Circuit.Elements[i].Name)
	}
	text := fmt.Sprintf("%s: %s, %s", strings.Join(names, ", "), Measured(p.LoadV, "V"), Measured(p.LoadI, "A"))
	fmt.Fprintln(w, l.paint("Load", bold))
	wrap(w, "  ", l.text(text))
	fmt.Fprintln(w)
}

// printEvidence says in one line why the point is believed, and which others
// there are.
func printEvidence(w io.Writer, a *Answer, l Look) {
	r := a.Result
	e := &r.Point.Evidence
	where := strings.TrimPrefix(e.Where, "current balance ")
	if where != "" {
		where = " " + where
	}
	said := []string{
		fmt.Sprintf("Found %s in %s", wayText(e.Way), count(e.Steps, "step")),
		fmt.Sprintf("largest imbalance %s%s", powerUnit(e.Residual, "A"), where),
		fmt.Sprintf("last step %s", powerUnit(e.LastStep, "V")),
	}
	if e.Attempts > 1 {
		said = append(said, count(e.Attempts, "attempt"))
	}
	if e.Fallbacks > 0 {
		how := " with a fresh choice of pivots"
		if e.Twofold {
			how = " with pivots chosen anew or in numbers of twice the digits (leakage alone holds a node)"
		}
		said = append(said, count(e.Fallbacks, "step")+how)
	}
	wrap(w, "", l.text(strings.Join(said, "; ")+"."))
	if a.Proof != nil {
		wrap(w, "", l.text("Proven to be the only operating point with "+scopeText(a.Proof)+"."))
	}
	if a.Every != nil {
		return
	}
	for _, o := range r.Others {
		wrap(w, "", l.text(otherText(r.Point, o)))
	}
}

// wayText fits the name of a way into "found … in 7 steps".
func wayText(way string) string {
	switch way {
	case "direct":
		return "directly"
	case "from rest":
		return way
	case "near":
		return "from the voltages asked for"
	case "search":
		return "by the search for all points"
	case "settling":
		return "by settling"
	default:
		return "by a " + way
	}
}

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// powerUnit writes a tiny number with its unit: 1.2e-17 A.
func powerUnit(x float64, unit string) string {
	if x == 0 {
		return "0 " + unit
	}
	return power(x, 1) + " " + unit
}

// otherText tells of another operating point by the first node that differs.
func otherText(p, o *solve.Point) string {
	const seen = 1e-3 // V; less is no difference that a screen shows
	text := "Another operating point was met"
	if o.Unstable {
		text += ", one that cannot be stable"
	}
	for n := range p.NodeV {
		a, b := p.NodeV[n], o.NodeV[n]
		if b-a > seen || a-b > seen {
			name := p.Circuit.Nodes[n].Name
			return fmt.Sprintf("%s: %s at %s, where this one has %s; --near %s=%.3g asks for it.", text, name, Measured(b, "V"), Measured(a, "V"), name, b)
		}
	}
	return text + "."
}

func printFailure(w io.Writer, f *solve.Failure, l Look) {
	fmt.Fprintln(w, l.paint("No operating point was found.", bad))
	wrap(w, "", l.text(f.Says))
	if len(f.Tried) == 0 {
		return
	}
	fmt.Fprintln(w)
	fmt.Fprintln(w, l.paint("Tried", bold))
	for _, t := range f.Tried {
		wrap(w, "  ", l.text(fmt.Sprintf("%s, %s: %s", t.Way, count(t.Steps, "step"), t.Ended)))
	}
}
