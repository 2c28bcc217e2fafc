package syntax

import (
	"strconv"
	"strings"
	"unicode/utf8"

	"biaswright/netlist/quantity"
)

// Layout of the canonical text.
const (
	// Lines of paths and lists are broken before this column where they can be.
	pageWidth = 100
	// What a rail, load, hold, … line says begins in this column, so that such
	// lines stand below each other whatever their first words.
	wordColumn = 8
	// Further lines of a path are indented by its word, lists alike.
	pathIndent = "     "
)

// Print returns the canonical text of a tree. Comments and single blank lines are
// kept, the spelling of numbers too except for spaces and for units, which are
// written in ASCII. Printing what the text parses to gives the same text again.
// The tree must come from a parse without errors.
func Print(f *File) []byte {
	p := &printer{}
	for i := 0; i < len(f.Statements); {
		n := partsFrom(f.Statements[i:])
		if n == 0 {
			p.statement(f.Statements[i], 0, 0)
			i++
			continue
		}
		parts := f.Statements[i : i+n]
		name, kind := 0, 0
		for _, s := range parts {
			part := s.(*Part)
			name, kind = max(name, len(part.Name.Text)), max(kind, len(part.Kind.Text))
		}
		for _, s := range parts {
			p.statement(s, name, kind)
		}
		i += n
	}
	p.comments(f.Tail)
	return []byte(p.out.String())
}

// partsFrom counts the part statements at the head that stand right below each
// other: their names and kinds are aligned.
func partsFrom(list []Statement) int {
	n := 0
	for n < len(list) {
		p, ok := list[n].(*Part)
		if !ok || n > 0 && (p.Notes.Blank || len(p.Notes.Before) > 0) {
			break
		}
		n++
	}
	return n
}

type printer struct {
	out strings.Builder
}

func (p *printer) blank(wanted bool) {
	if wanted && p.out.Len() > 0 {
		p.out.WriteByte('\n')
	}
}

func (p *printer) comments(list []Comment) {
	for _, c := range list {
		p.blank(c.Blank)
		p.out.WriteString("#" + c.Text + "\n")
	}
}

// statement prints one with its comments. A part's name and kind are padded to
// the given widths.
func (p *printer) statement(s Statement, name, kind int) {
	notes := notesOf(s)
	p.comments(notes.Before)
	p.blank(notes.Blank)
	switch s := s.(type) {
	case *Path:
		p.list("path ", "-> ", " ", pathIndent, segmentTexts(s.Segments), notes.Within)
	case *Part:
		head := "part " + pad(s.Name.Text, name) + " " + s.Kind.Text
		if len(s.Params) > 0 {
			head = "part " + pad(s.Name.Text, name) + " " + pad(s.Kind.Text, kind) + "  "
		}
		p.list(head, "", ",", pathIndent, paramTexts(s.Params), notes.Within)
	case *Assume:
		p.list(pad("assume", wordColumn), "", ",", strings.Repeat(" ", wordColumn), paramTexts(s.Items), notes.Within)
	default:
		p.out.WriteString(lineText(s))
	}
	if notes.Behind != "" {
		p.out.WriteString("  #" + notes.Behind)
	}
	p.out.WriteByte('\n')
}

// list prints items over as many lines as they need. Between items stands the
// tail of the one (a comma) and the head of the next (an arrow); where the line
// is broken, the head begins the new one.
func (p *printer) list(first, head, tail, indent string, items []string, within []Inner) {
	p.out.WriteString(first)
	column := utf8.RuneCountInString(first)
	fresh := true // nothing of the list stands on the line
	for i, item := range items {
		last := i == len(items)-1
		if i > 0 {
			item = head + item
		}
		if !last {
			item += strings.TrimRight(tail, " ")
		}
		width := utf8.RuneCountInString(item)
		if !fresh && column+1+width > pageWidth {
			p.out.WriteString("\n" + indent)
			column, fresh = len(indent), true
		}
		if !fresh {
			p.out.WriteByte(' ')
			column++
		}
		p.out.WriteString(item)
		column, fresh = column+width, false
		if p.inner(&within, i+1, indent) && !last {
			p.out.WriteString("\n" + indent)
			column, fresh = len(indent), true
		}
	}
}

// inner prints the comments behind so many items and tells whether there were any.
func (p *printer) inner(within *[]Inner, after int, indent string) bool {
	found := false
	for len(*within) > 0 && (*within)[0].After <= after {
		c := (*within)[0]
		*within = (*within)[1:]
		if c.Own || found {
			p.out.WriteString("\n" + indent + "#" + c.Text)
		} else {
			p.out.WriteString("  #" + c.Text)
		}
		found = true
	}
	return found
}

func notesOf(s Statement) *Notes { return &s.(interface{ base() *stmt }).base().Notes }

func (s *stmt) base() *stmt { return s }

func pad(text string, width int) string {
	return text + strings.Repeat(" ", max(width-len(text), 0))
}

// lineText is a statement that has one line.
func lineText(s Statement) string {
	word := func(w string) string { return pad(w, wordColumn-1) + " " }
	switch s := s.(type) {
	case *Title:
		return "title " + quote(s.Text)
	case *Use:
		if s.Shelf != nil {
			return "use " + s.Shelf.Text
		}
		return "use " + quote(s.Path)
	case *Given:
		return word("given") + s.Name.Text + " = " + ExprText(s.Value) + boundsText(s.Bounds)
	case *Rail:
		return word("rail") + s.Name.Text + " = " + valueText(&s.Value)
	case *Ambient:
		return word("ambient") + "= " + valueText(&s.Value)
	case *Place:
		return placeText(s)
	case *Load:
		return word("load") + wordsText(s.Names)
	case *Batch:
		return word("batch") + wordsText(s.Names)
	case *Hold:
		return word("hold") + ExprText(s.Quantity) + " within " + valueText(&s.Within)
	case *Target:
		text := word("target") + ExprText(s.Quantity) + " = " + valueText(&s.Value)
		if s.Within != nil {
			text += " within " + valueText(s.Within)
		}
		return text
	case *Keep:
		mark := " < "
		if s.Greater {
			mark = " > "
		}
		return word("keep") + ExprText(s.Left) + mark + ExprText(s.Right)
	case *Hand:
		return word("hand") + ExprText(s.Quantity) + " = " + ExprText(s.Value)
	case *Measured:
		return word("measured") + ExprText(s.Quantity) + " = " + valueText(&s.Value)
	}
	panic("syntax: no such statement") // the tree has no other
}

func wordsText(list []Word) string {
	texts := make([]string, len(list))
	for i, w := range list {
		texts[i] = w.Text
	}
	return strings.Join(texts, " ")
}

func placeText(s *Place) string {
	text := "place " + s.Name.Text + " " + s.Part.Text
	for _, pin := range s.Pins {
		text += " " + pin.Key.Text + "=" + pin.Node.Text
	}
	return text + modifiersText(s.Modifiers)
}

func segmentTexts(list []Segment) []string {
	out := make([]string, len(list))
	for i, s := range list {
		if s.Element != nil {
			out[i] = elementText(s.Element)
		} else {
			out[i] = s.Node.Text
		}
	}
	return out
}

func elementText(e *Element) string {
	text := e.Name.Text + " "
	switch e.What {
	case WhatName:
		text += e.Ref.Text
	case WhatDrop:
		text += "drop " + valueText(e.Value)
	case WhatCell:
		text += "cell " + valueText(e.Value)
	case WhatOpen:
		text += "? " + e.Series.Text
	default:
		text += valueText(e.Value)
	}
	return text + modifiersText(e.Modifiers)
}

func modifiersText(list []Modifier) string {
	text := ""
	for _, m := range list {
		switch {
		case m.Bounds != nil:
			text += boundsText(m.Bounds)
		case m.Key.Text == "":
			text += " " + valueText(m.Value)
		case m.Value != nil:
			text += " " + m.Key.Text + "=" + valueText(m.Value)
		case m.Name != nil:
			text += " " + m.Key.Text + "=" + m.Name.Text
		default:
			text += " " + m.Key.Text
		}
	}
	return text
}

func paramTexts(list []Param) []string {
	out := make([]string, len(list))
	for i, p := range list {
		out[i] = p.Key.Text
		if p.Of != nil {
			out[i] += "(" + p.Of.Text + ")"
		}
		out[i] += " = " + valueText(&p.Value)
	}
	return out
}

func valueText(v *Value) string {
	text := ""
	if v.Name != nil {
		text = v.Name.Text
	} else {
		text = literalText(v.Literal)
	}
	text += boundsText(v.Bounds)
	if v.At != nil {
		text += " at " + valueText(v.At)
	}
	return text
}

// boundsText begins with a space where there are bounds.
func boundsText(b *Bounds) string {
	if b == nil {
		return ""
	}
	text := ""
	switch {
	case b.Relative != nil:
		text = " " + literalText(b.Relative)
	case b.Low != nil:
		text = " (" + literalText(b.Low) + " .. " + literalText(b.High) + ")"
	}
	switch b.Spread {
	case Normal:
		text += " normal"
	case Pick:
		text += " pick"
		for i := range b.Picks {
			text += " " + literalText(&b.Picks[i])
		}
	}
	return text
}

// literalText is a number as it was written, tidied; the shortest text that reads
// back where it was never written.
func literalText(l *Literal) string {
	if r, err := quantity.Parse(l.Text); err == nil && r.Value == l.Value {
		return r.Text()
	}
	return quantity.Exact(l.Quantity)
}

// How tightly an expression holds together; a looser one needs brackets within a
// tighter one.
const (
	tightSum = iota
	tightProduct
	tightSign
	tightPower
	tightPrimary
)

func tightness(x Expr) int {
	switch x := x.(type) {
	case *Unary:
		return tightSign
	case *Binary:
		switch x.Op {
		case '+', '-':
			return tightSum
		case '*', '/':
			return tightProduct
		}
		return tightPower
	}
	return tightPrimary
}

// ExprText returns the canonical text of an expression.
func ExprText(x Expr) string {
	var b strings.Builder
	writeExpr(&b, x)
	return b.String()
}

func writeExpr(b *strings.Builder, x Expr) {
	switch x := x.(type) {
	case *Number:
		b.WriteString(literalText(&x.Literal))
	case *NameExpr:
		b.WriteString(x.Text)
	case *QuantityExpr:
		b.WriteString(x.Subject.Text)
		if x.Index > 0 {
			b.WriteString("." + strconv.Itoa(x.Index))
		}
		b.WriteString("." + x.Symbol.Text)
	case *Unary:
		sign := byte('+')
		if x.Minus {
			sign = '-'
		}
		b.WriteByte(sign)
		writeWithin(b, x.X, tightness(x.X) < tightSign || x.Minus && beginsWithTemperature(x.X))
	case *Binary:
		writeBinary(b, x)
	case *Call:
		b.WriteString(x.Func.Text + "(")
		for i, a := range x.Args {
			if i > 0 {
				b.WriteString(", ")
			}
			writeExpr(b, a)
		}
		b.WriteByte(')')
	}
}

func writeWithin(b *strings.Builder, x Expr, brackets bool) {
	if !brackets {
		writeExpr(b, x)
		return
	}
	b.WriteByte('(')
	writeExpr(b, x)
	b.WriteByte(')')
}

func writeBinary(b *strings.Builder, x *Binary) {
	own := tightness(x)
	if x.Op == '^' { // groups to the right, and may have a sign there
		writeWithin(b, x.X, tightness(x.X) <= own)
		b.WriteByte('^')
		writeWithin(b, x.Y, tightness(x.Y) < tightSign)
		return
	}
	writeWithin(b, x.X, tightness(x.X) < own)
	b.WriteString(" " + string(rune(x.Op)) + " ")
	writeWithin(b, x.Y, tightness(x.Y) <= own)
}

// beginsWithTemperature tells whether a minus before the text of x would become
// the sign of a temperature.
func beginsWithTemperature(x Expr) bool {
	switch x := x.(type) {
	case *Number:
		return x.Unit.Absolute && x.Value >= 0
	case *Binary:
		return x.Op == '^' && beginsWithTemperature(x.X)
	}
	return false
}
