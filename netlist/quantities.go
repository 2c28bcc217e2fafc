package netlist

import (
	"strconv"
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// The symbols of each subject, in the order in which they are listed. Their units
// follow from their first letter.
var (
	nodeSymbols       = []string{"V"}
	loadSymbols       = []string{"V", "I"}
	branchSymbols     = []string{"V", "I", "P"}
	junctionSymbols   = []string{"V", "I", "P", "Tj"}
	transistorSymbols = []string{"Ic", "Ib", "Ie", "Vbe", "Vce", "P", "Tj"}
	pnpSymbols        = []string{"Ic", "Ib", "Ie", "Veb", "Vec", "P", "Tj"}
)

func symbolUnit(symbol string) quantity.Unit {
	switch symbol[0] {
	case 'V':
		return quantity.Volt
	case 'I':
		return quantity.Ampere
	case 'P':
		return quantity.Watt
	}
	return quantity.Celsius
}

// symbols are those of an element.
func (c *Circuit) symbols(i int) []string {
	e := &c.Elements[i]
	switch {
	case e.Kind == JunctionPart:
		return junctionSymbols
	case e.Kind != TransistorPart:
		return branchSymbols
	case c.Parts[e.Part].Kind.PNP:
		return pnpSymbols
	}
	return transistorSymbols
}

// symbolList writes the quantities of a subject: "R1.V, R1.I or R1.P".
func symbolList(subject string, symbols []string) string {
	out := ""
	for i, s := range symbols {
		switch {
		case i == 0:
		case i == len(symbols)-1:
			out += " or "
		default:
			out += ", "
		}
		out += subject + "." + s
	}
	return out
}

func quantityText(q *syntax.QuantityExpr) string {
	if q.Index > 0 {
		return q.Subject.Text + "." + strconv.Itoa(q.Index) + "." + q.Symbol.Text
	}
	return q.Subject.Text + "." + q.Symbol.Text
}

// refOf binds SUBJECT.SYMBOL to what the circuit has. The diagnostic is nil where
// it has it.
func (c *Circuit) refOf(s *scope, q *syntax.QuantityExpr) (Ref, *diag.Diagnostic) {
	ref := Ref{Symbol: q.Symbol.Text, Text: quantityText(q), Member: q.Index}
	name := q.Subject.Text
	var symbols []string
	var is string
	switch name {
	case "load":
		ref.Subject, symbols, is = OfLoad, loadSymbols, "the load"
	case "gnd", "GND":
		ref.Subject, ref.Index, symbols, is = OfNode, int(Gnd), nodeSymbols, "the reference node"
	case "ambient":
		return ref, refusal("unknown-quantity", q.Span, "in an expression, ambient alone is the temperature", "ambient has no quantities")
	default:
		t := s.names[name]
		if t == nil {
			if id, ok := s.made[name]; ok {
				ref.Subject, ref.Index, symbols, is = OfNode, int(id), nodeSymbols, "a node"
				break
			}
			return ref, refusal("unknown-name", q.Subject.Span, "", "there is no node, element or rail called "+name)
		}
		switch t.sort {
		case aNode:
			ref.Subject, ref.Index, symbols, is = OfNode, t.index, nodeSymbols, "a node"
		case aRail:
			ref.Subject, ref.Index, symbols, is = OfRail, t.index, branchSymbols, "a rail"
		case anElement:
			ref.Subject, ref.Index, symbols, is = OfElement, t.index, c.symbols(t.index), c.describe(t.index)
		default:
			return ref, refusal("unknown-quantity", q.Subject.Span, "quantities are of nodes, elements, rails and the load", name+" is "+t.sort.String()+", which has no quantities")
		}
	}
	if d := c.member(ref, q); d != nil {
		return ref, d
	}
	for _, symbol := range symbols {
		if symbol == q.Symbol.Text {
			ref.Unit = symbolUnit(symbol)
			return ref, nil
		}
	}
	hint := didYouMean(q.Symbol.Text, symbols)
	return ref, refusal("unknown-quantity", q.Symbol.Span, hint, name+" is "+is+"; there is "+symbolList(name, symbols)+", not "+q.Symbol.Text)
}

// member checks the number of one of a row.
func (c *Circuit) member(ref Ref, q *syntax.QuantityExpr) *diag.Diagnostic {
	switch {
	case q.Index == 0:
		return nil
	case ref.Subject != OfElement || c.Elements[ref.Index].Row < 2:
		return refusal("unknown-quantity", q.Span, "", q.Subject.Text+" is not a row of several")
	case q.Index > c.Elements[ref.Index].Row:
		return refusal("unknown-quantity", q.Span, "", q.Subject.Text+" is a row of "+strconv.Itoa(c.Elements[ref.Index].Row)+" and has no number "+strconv.Itoa(q.Index))
	}
	return nil
}

// subjects lists what quantities may be of, for the spelling helper.
func (s *scope) subjects(like string) []string {
	names := s.near(aNode, aRail, anElement)
	if strings.Contains(like, ":") {
		names = append(names, sortedKeys(s.made)...)
	}
	return names
}

func refusal(code string, at diag.Span, hint, message string) *diag.Diagnostic {
	return &diag.Diagnostic{Code: code, Message: message, Span: at, Hint: hint}
}

// quantityRef binds a quantity while the circuit is resolved.
func (r *resolver) quantityRef(q *syntax.QuantityExpr) (Ref, bool) {
	if t := r.local.names[q.Subject.Text]; t != nil && t.sort == anElement && (t.element == nil || !t.element.sound) {
		return Ref{}, false // what it is was refused already
	}
	if q.Subject.Text == "load" && len(statements[*syntax.Load](r.tree)) == 0 && !r.partial {
		r.errorf("unknown-quantity", q.Span, "name its elements: load LAMP", "the file has no load")
		return Ref{}, false
	}
	ref, d := r.c.refOf(r.local, q)
	if d == nil {
		return ref, true
	}
	if d.Code == "unknown-name" {
		r.unknown(q.Subject, func() []string { return r.local.subjects(q.Subject.Text) }, "%s", d.Message)
		return ref, false
	}
	r.diags = append(r.diags, *d)
	return ref, false
}
