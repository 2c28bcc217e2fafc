package netlist

import (
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

// messageDigits are the significant digits of a number in a message.
const messageDigits = 6

// noun is a unit as sentences speak of it: "volts".
func noun(u quantity.Unit) string { return u.Words() }

// show writes a number as a message has it: "1.8 kohm".
func show(value float64, u quantity.Unit) string {
	return quantity.FormatASCII(quantity.Quantity{Value: value, Unit: u}, messageDigits)
}

// article puts the article before the name of a kind: "a diode", "an npn".
func article(name string) string {
	if name == "" {
		return name
	}
	if strings.ContainsRune("aeiou", rune(name[0])) || name == "npn" {
		return "an " + name
	}
	return "a " + name
}

func didYouMean(word string, candidates []string) string { return diag.DidYouMean(word, candidates) }

// The ranks of operators: one of a higher rank binds closer.
const (
	rankSum = iota + 1
	rankProduct
	rankSign
	rankPower
	rankWhole // needs no brackets anywhere
)

func rank(x syntax.Expr) int {
	switch x := x.(type) {
	case *syntax.Unary:
		return rankSign
	case *syntax.Binary:
		switch x.Op {
		case '+', '-':
			return rankSum
		case '*', '/':
			return rankProduct
		}
		return rankPower
	}
	return rankWhole
}

// exprText writes an expression with the fewest brackets and one space around
// operators: a difference or quotient on the right needs them, a power of a power
// on the left.
func exprText(x syntax.Expr) string {
	var b strings.Builder
	writeExpr(&b, x, 0)
	return b.String()
}

// writeExpr writes x, in brackets where it binds less than least.
func writeExpr(b *strings.Builder, x syntax.Expr, least int) {
	own := rank(x)
	if own < least {
		b.WriteByte('(')
		defer b.WriteByte(')')
	}
	switch x := x.(type) {
	case *syntax.Number:
		b.WriteString(x.Text)
	case *syntax.NameExpr:
		b.WriteString(x.Text)
	case *syntax.QuantityExpr:
		b.WriteString(quantityText(x))
	case *syntax.Unary:
		if x.Minus {
			b.WriteByte('-')
		}
		writeExpr(b, x.X, own)
	case *syntax.Binary:
		left, right := own, own+1
		if x.Op == '^' {
			left, right = own+1, rankSign // 2 ^ -1 and 2 ^ 3 ^ 2 read as they are bound
		}
		writeExpr(b, x.X, left)
		b.WriteString(" " + string(x.Op) + " ")
		writeExpr(b, x.Y, right)
	case *syntax.Call:
		b.WriteString(x.Func.Text + "(")
		for i, a := range x.Args {
			if i > 0 {
				b.WriteString(", ")
			}
			writeExpr(b, a, 0)
		}
		b.WriteByte(')')
	}
}
