package syntax

import (
	"biaswright/netlist/diag"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

// same compares trees but for places, comments that moved and the spelling of
// numbers.
func same(a, b *File) string {
	return cmp.Diff(a.Statements, b.Statements,
		cmp.AllowUnexported(Title{}, Use{}, Given{}, Rail{}, Ambient{}, Part{}, Path{}, Place{}, Load{}, Hold{}, Target{}, Keep{}, Batch{}, Assume{}, Hand{}, Measured{}),
		cmp.Comparer(func(x, y diag.Span) bool { return true }),
		cmp.FilterPath(func(p cmp.Path) bool {
			f, ok := p.Last().(cmp.StructField)
			return ok && f.Name() == "Text" && p.Index(-2).Type() == literalType
		}, cmp.Ignore()),
		cmpopts.EquateEmpty(),
	)
}
