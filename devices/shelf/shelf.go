// Package shelf holds the parts that ship, as texts in the bias language. A file
// takes one in by its name: `use generic`.
package shelf

import (
	_ "embed"
	"slices"
)

//go:embed generic.bias
var generic []byte

// Text returns the text of the shelf of that name; the caller owns it.
func Text(name string) ([]byte, bool) {
	if name != "generic" {
		return nil, false
	}
	return slices.Clone(generic), true
}

// Names lists the shelves.
func Names() []string { return []string{"generic"} }
