package netlist

import (
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
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
