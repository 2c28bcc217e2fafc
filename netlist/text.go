package netlist

import (
	"strings"

	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// nouns are the units as sentences speak of them.
var nouns = map[quantity.Unit]string{
	quantity.One: "a plain number", quantity.Volt: "volts", quantity.Ampere: "amps", quantity.Watt: "watts",
	quantity.Ohm: "ohms", quantity.Siemens: "siemens", quantity.Kelvin: "kelvin", quantity.Celsius: "degrees Celsius",
	quantity.EV: "electronvolts",
}

func noun(u quantity.Unit) string {
	if n, ok := nouns[u]; ok {
		return n
	}
	return symbol(u)
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
