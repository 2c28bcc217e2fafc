package netlist

import (
	"fmt"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/netlist/syntax"
)

const maxText = 16 << 20

var (
	symbol          = func(u quantity.Unit) string { return fmt.Sprint(u) }
	show            = func(v float64, u quantity.Unit) string { return fmt.Sprint(v, symbol(u)) }
	readsAsQuantity = func(text string) bool { return false }
	knownSeries     = func(name string) bool { return name == "E24" }
	parseValue      = func(text string, want quantity.Unit) (*syntax.Value, diag.List) { panic("seam") }
	parseExpr       = func(text string) (syntax.Expr, diag.List) { panic("seam") }
	exprText        = func(x syntax.Expr) string { return "" }
	parseText       = func(name string, text []byte) (*syntax.File, diag.List) { panic("seam") }
)
