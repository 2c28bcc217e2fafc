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

// All returns the text of every shelf by its name, as netlist.Files has them; the caller
// owns them.
func All() map[string][]byte {
	out := map[string][]byte{}
	for _, name := range Names() {
		out[name], _ = Text(name)
	}
	return out
}

// Names lists the shelves.
func Names() []string { return []string{"generic"} }
