package netlist

import "biaswright/netlist/quantity"

// A Catalogue tells the language which kinds of part exist and what may be said
// of them. The models live in package devices, which fills a Catalogue; the
// language never imports them.
type Catalogue struct {
	Kinds []Kind
}

// Kind returns the kind of that name.
func (c *Catalogue) Kind(name string) (*Kind, bool) {
	for i := range c.Kinds {
		if c.Kinds[i].Name == name {
			return &c.Kinds[i], true
		}
	}
	return nil, false
}

// A Shape is how a kind sits in a circuit.
type Shape int

// The shapes: a two-terminal junction or a three-terminal transistor.
const (
	Junction Shape = iota
	Transistor
)

// A Kind is a kind of part: diode, led, zener, npn, pnp.
type Kind struct {
	Name  string
	Shape Shape
	// PNP tells that conventional current enters at the emitter.
	PNP bool
	// Params lists what may be stated, in a fixed order: an element's Params
	// slots follow it index by index.
	Params []Param
}

// Index returns the position of the parameter of that name, or -1.
func (k *Kind) Index(name string) int {
	for i := range k.Params {
		if k.Params[i].Name == name {
			return i
		}
	}
	return -1
}

// A Sign is what numbers a parameter admits.
type Sign int

// The signs.
const (
	Any Sign = iota
	NotNegative
	Positive
)

// A Param is one parameter of a kind.
type Param struct {
	Name string
	Unit quantity.Unit
	// Default is used where neither the parameter nor a rival is stated; NaN
	// means none.
	Default float64
	Sign    Sign
	// Infinite allows the word infinite.
	Infinite bool
	// At is, for a stated point ("drop = 0.62 V at 1 mA"), the name of the
	// parameter that holds the second co-ordinate; it stands in Params too,
	// marked Hidden, and cannot be written by itself in a part statement.
	At     string
	Hidden bool
	// Rivals are the parameters that this one replaces when stated.
	Rivals []string
	// Rating marks a limit (Pmax) that no equation uses.
	Rating bool
	// Doc says what it is; Source where its default is from.
	Doc, Source string
}
