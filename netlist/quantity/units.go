package quantity

import (
	"fmt"
	"strings"
)

// A written is a unit as it may stand in a text: what it means, the power of ten
// that it carries, and whether an SI prefix may stand before it.
type written struct {
	unit  Unit
	ten   int
	bare  bool // a prefix alone
	ascii string
}

// bases are the units that a text may name. Percent is 1e-2, ppm 1e-6.
var bases = []struct {
	text, ascii string
	unit        Unit
	ten         int
	prefixed    bool
}{
	{"V", "V", Volt, 0, true},
	{"A", "A", Ampere, 0, true},
	{"W", "W", Watt, 0, true},
	{"ohm", "ohm", Ohm, 0, true},
	{"\u03a9", "ohm", Ohm, 0, true}, // Greek capital omega
	{"\u2126", "ohm", Ohm, 0, true}, // ohm sign
	{"S", "S", Siemens, 0, true},
	{"K", "K", Kelvin, 0, true},
	{"eV", "eV", EV, 0, true},
	{"V/K", "V/K", VoltPerK, 0, true},
	{"degC", "degC", Celsius, 0, false},
	{"°C", "degC", Celsius, 0, false},
	{"%", "%", One, -2, false},
	{"ppm/K", "ppm/K", PerKelvin, -6, false},
	{"%/K", "%/K", PerKelvin, -2, false},
	{"K/W", "K/W", KelvinPerW, 0, false},
}

// prefixes are those of the language, from small to large.
var prefixes = []struct {
	text, ascii string
	ten         int
}{
	{"f", "f", -15},
	{"p", "p", -12},
	{"n", "n", -9},
	{"u", "u", -6},
	{"\u00b5", "u", -6}, // micro sign
	{"\u03bc", "u", -6}, // Greek small mu
	{"m", "m", -3},
	{"k", "k", 3},
	{"M", "M", 6},
	{"G", "G", 9},
}

// suffixes holds every unit with every prefix that it may have, and the prefixes
// alone.
var suffixes = func() map[string]written {
	m := map[string]written{}
	for _, b := range bases {
		m[b.text] = written{b.unit, b.ten, false, b.ascii}
	}
	for _, p := range prefixes {
		m[p.text] = written{One, p.ten, true, p.ascii}
		for _, b := range bases {
			if b.prefixed {
				m[p.text+b.text] = written{b.unit, p.ten, false, p.ascii + b.ascii}
			}
		}
	}
	return m
}()

// names of the dimensions: the symbol in ASCII, the symbol, the words.
var names = map[Unit]struct{ ascii, symbol, words string }{
	One:        {"", "", "a plain number"},
	Volt:       {"V", "V", "volts"},
	Ampere:     {"A", "A", "amps"},
	Watt:       {"W", "W", "watts"},
	Ohm:        {"ohm", "Ω", "ohms"},
	Siemens:    {"S", "S", "siemens"},
	Kelvin:     {"K", "K", "kelvin"},
	Celsius:    {"degC", "°C", "degrees Celsius"},
	EV:         {"eV", "eV", "electronvolts"},
	PerKelvin:  {"1/K", "1/K", "a fraction per kelvin"},
	VoltPerK:   {"V/K", "V/K", "volts per kelvin"},
	KelvinPerW: {"K/W", "K/W", "kelvin per watt"},
}

// String returns the unit's symbol in ASCII: "ohm", "K/W", "V^2 A"; "" for a
// plain number.
func (u Unit) String() string {
	if n, ok := names[u]; ok {
		return n.ascii
	}
	return u.powers()
}

// Symbol returns the unit's symbol as printed in the trade: "Ω", "°C".
func (u Unit) Symbol() string {
	if n, ok := names[u]; ok {
		return n.symbol
	}
	return u.powers()
}

// Words returns the unit as sentences speak of it: "volts", "a plain number".
func (u Unit) Words() string {
	if n, ok := names[u]; ok {
		return n.words
	}
	return u.powers()
}

func (u Unit) powers() string {
	var parts []string
	for _, d := range []struct {
		symbol string
		power  int8
	}{{"V", u.Volt}, {"A", u.Ampere}, {"K", u.Kelvin}, {"eV", u.ElectronVolt}} {
		switch d.power {
		case 0:
		case 1:
			parts = append(parts, d.symbol)
		default:
			parts = append(parts, fmt.Sprintf("%s^%d", d.symbol, d.power))
		}
	}
	return strings.Join(parts, " ")
}
