package hand_test

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"testing"

	"biaswright/netlist"
	"biaswright/solve/reftest"
)

// A bookCase is a book's example whose figures rest on what assume can state.
type bookCase struct {
	id, assume string
	figures    map[string]string // our quantity, the file's figure
	// rounded takes the book's own figures, within their tolerance, where its formula
	// is not kept to all digits or goes beyond what is assumed.
	rounded bool
}

// The other examples of the file use formulas that no circuit obeys, such as I_C = I_E
// with a base current, or the exponential law with V_T of 25 or 26 mV; X20's needs a second
// junction in the divider, which its network does not have.
var bookCases = []bookCase{
	{id: "X01", assume: "Vbe = 0.7 V", figures: map[string]string{"Q1.Ic": "I_C", "c.V": "V_CE", "Q1.Ib": "I_B"}},
	{id: "X03", assume: "Vbe = 0.7 V, betaF = infinite", figures: map[string]string{"Q1.Ic": "I_C", "Q1.Vec": "V_EC"}},
	{id: "X09", assume: "Vbe = 0.7 V", figures: map[string]string{"Q1.Ic": "I_C", "Q1.Vce": "V_CE"}},
	{id: "X11", assume: "Vbe = 0.7 V", figures: map[string]string{"Q1.Ib": "I_B", "Q1.Ic": "I_C", "c.V": "V_CE"}},
	{id: "X14", assume: "Vbe = 0.7 V, betaF = infinite", figures: map[string]string{"b.V": "V_B", "e.V": "V_E"}},
	{id: "X14", assume: "Vbe = 0.7 V", figures: map[string]string{"b.V": "V_B", "e.V": "V_E", "c.V": "V_C"}, rounded: true},
	{id: "X15", assume: "Vbe = 0.7 V, drop(LR) = 1.7 V, betaF = infinite", figures: map[string]string{"Q1.Ic": "I_C", "R3.I": "I_R3"}},
	{id: "X17", assume: "Vbe = 0.7 V, betaF = infinite", figures: map[string]string{"Q1.Ic": "I_C"}},
	{id: "X21", assume: "Vbe = 0.7 V", figures: map[string]string{"R1.I": "I_REF", "Q2.Ic": "I_O"}},
	{id: "X23", assume: "Vbe = 0.715 V", figures: map[string]string{"Q2.Ic": "I_O"}},
	{id: "X29", assume: "Vbe = 0.7 V", figures: map[string]string{"R1.I": "I_REF", "Q2.Ic": "I_O"}},
	// The book's resistors are rounded, hence its figures too.
	{id: "X57", assume: "Vbe = 0.65 V, betaF = infinite", figures: map[string]string{"Q7.Ic": "I_7", "Q8.Ic": "I_8"}, rounded: true},
	{id: "X59", assume: "Vbe = 0.7 V, Vz(Z) = 5.6 V, VA = infinite", figures: map[string]string{"Q1.Ic": "I_O_with_picks"}},
	{id: "X62", assume: "Vbe(Q) = 0.7 V, Vbe(H) = 0.6 V", figures: map[string]string{"R1.I": "I_REF", "Q2.Ic": "I_O", "Q3.Ie": "I_E3", "Q3.Ib": "I_B3"}},
}

// The circuit under a book's assumptions gives the book's figures: its formula to 0.1 %,
// or what it prints within its rounding. The sources stand in the file, case by case.
func TestBooksIdealisations(t *testing.T) {
	cases, err := reftest.Cases(filepath.Join("..", "..", "testdata", "reference", "bias-networks.json"))
	if err != nil {
		t.Fatal(err)
	}
	for _, b := range bookCases {
		t.Run(b.id+" "+b.assume, func(t *testing.T) {
			at := slices.IndexFunc(cases, func(c reftest.Case) bool { return c.ID == b.id })
			if at < 0 {
				t.Fatal("the file has no such case")
			}
			text, err := cases[at].Text()
			if err != nil {
				t.Fatal(err)
			}
			source := string(text.Source) + "assume " + b.assume + "\n"
			for _, q := range sortedKeys(b.figures) {
				unit := map[bool]string{true: "V", false: "A"}[q[len(q)-1] == 'V' || q == "Q1.Vec" || q == "Q1.Vce"]
				source += fmt.Sprintf("hand %s = %g %s\n", q, figureOf(t, &cases[at], b.figures[q]).Value, unit)
			}
			a := check(t, read(t, b.id+".bias", source))
			if a.Unsplit != nil {
				t.Fatal(a.Unsplit)
			}
			for i := range a.Rows {
				r := &a.Rows[i]
				f := figureOf(t, &cases[at], b.figures[r.Q.Text])
				want, within := f.Value, f.TolRel
				if !b.rounded {
					if f.ClosedForm == nil {
						t.Fatalf("%s has no closed form", f.Name)
					}
					want, within = *f.ClosedForm, 1e-3
				}
				if d := math.Abs(r.Ideal/want - 1); !(d <= within) {
					t.Errorf("%s = %.8g idealised, the book has %.8g: %.2g apart", r.Q.Text, r.Ideal, want, d)
				} else {
					t.Logf("%s = %.8g, %.2g from the book", r.Q.Text, r.Ideal, d)
				}
			}
		})
	}
}

func figureOf(t *testing.T, c *reftest.Case, name string) reftest.Figure {
	t.Helper()
	for _, f := range c.Expected {
		if f.Name == name {
			return f
		}
	}
	t.Fatalf("%s has no figure %s", c.ID, name)
	return reftest.Figure{}
}

func sortedKeys(m map[string]string) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

// Every network of the reference file can be idealised in the usual way, in any part, and
// its differences shared out.
func TestReferenceNetworksAreSharedOut(t *testing.T) {
	cases, err := reftest.Cases(filepath.Join("..", "..", "testdata", "reference", "bias-networks.json"))
	if err != nil {
		t.Fatal(err)
	}
	ran := 0
	for i := range cases {
		text, err := cases[i].Text()
		if err != nil || len(cases[i].Elements) == 0 {
			continue // the language has no ideal amplifier, and X56 is a formula
		}
		source := string(text.Source)
		c := read(t, cases[i].ID+".bias", source)
		assume, hands := "", ""
		for _, p := range c.Parts {
			if p.Kind.Shape == netlist.Junction {
				assume += ", drop(" + p.Name + ") = 0.65 V"
			}
		}
		for _, e := range c.Elements {
			switch e.Kind {
			case netlist.TransistorPart:
				hands += "hand " + e.Name + ".Ic = 1 mA\n"
			case netlist.JunctionPart:
				hands += "hand " + e.Name + ".I = 1 mA\n"
			}
		}
		if hands == "" {
			continue
		}
		a := check(t, read(t, cases[i].ID+".bias", source+"assume Vbe = 0.65 V, betaF = infinite, VA = infinite"+assume+"\n"+hands))
		if a.Unsplit != nil {
			t.Errorf("%s: %v", cases[i].ID, a.Unsplit)
			continue
		}
		for k := range a.Rows {
			r := &a.Rows[k]
			sum := r.Ideal
			for _, s := range r.Shares {
				sum += s
			}
			if !(math.Abs(sum-r.Full) <= 1e-9*math.Max(math.Abs(r.Full), math.Abs(r.Ideal))) {
				t.Errorf("%s: %s: %g, shares lead to %g", cases[i].ID, r.Q.Text, r.Full, sum)
			}
		}
		ran++
	}
	const few = 40 // of 54; some have no junction, two an amplifier
	if ran < few {
		t.Errorf("%d networks, expected %d", ran, few)
	}
}
