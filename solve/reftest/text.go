package reftest

import (
	"fmt"
	"maps"
	"slices"
	"strconv"
	"strings"
	"unicode"
)

// A Text is a network written in the bias language, with the names that its
// nodes and elements have there. The reference node is "gnd". Node names that an
// element or part bears too, or that the language reserves, get a suffix.
type Text struct {
	Source []byte
	Node   map[string]string // by the network's own name
	Part   map[string]string
	// Element names stay; Rail has the rail that stands for a voltage source
	// against ground, and Sign -1 where its plus end is the ground.
	Rail map[string]string
	Sign map[string]float64
}

// Text writes the network in the bias language. A voltage source against ground
// becomes a rail, another one a cell; a diode-connected transistor is put by its
// pins, which has no arrow that reads better. Numbers keep every digit. The error
// says what the language cannot express.
func (n *Network) Text() (*Text, error) {
	t := &Text{Node: map[string]string{n.Ground: "gnd"}, Part: map[string]string{}, Rail: map[string]string{}, Sign: map[string]float64{}}
	taken := map[string]bool{}
	for _, e := range n.Elements {
		if e.Type == "ideal_opamp" {
			return nil, fmt.Errorf("%s: the language has no ideal amplifier", e.Name)
		}
		if e.Type != "voltage_source" || !n.grounded(e) {
			taken[e.Name] = true
		}
	}
	for _, e := range n.Elements {
		for _, pin := range pins[e.Type] {
			if node := e.Pins[pin]; t.Node[node] == "" {
				t.Node[node] = legal(node, taken)
			}
		}
	}
	for _, name := range slices.Sorted(maps.Keys(n.Models)) {
		t.Part[name] = legal(name, taken)
	}

	var b strings.Builder
	fmt.Fprintf(&b, "title %q\n\n", n.Title)
	for _, e := range n.Elements {
		if e.Type != "voltage_source" || !n.grounded(e) {
			continue
		}
		node, sign := e.Pins["plus"], 1.0
		if node == n.Ground {
			node, sign = e.Pins["minus"], -1
		}
		t.Rail[e.Name], t.Sign[e.Name] = t.Node[node], sign
		fmt.Fprintf(&b, "rail %s = %s V\n", t.Node[node], number(sign*e.Value))
	}
	fmt.Fprintf(&b, "ambient = %s degC\n\n", celsius(n.Kelvin))
	for _, name := range slices.Sorted(maps.Keys(n.Models)) {
		b.WriteString(part(t.Part[name], n.Models[name]))
	}
	b.WriteByte('\n')
	for _, e := range n.Elements {
		b.WriteString(t.statement(n, e))
	}
	t.Source = []byte(b.String())
	return t, nil
}

// grounded tells whether a voltage source has an end at the reference node.
func (n *Network) grounded(e Element) bool {
	return e.Pins["plus"] == n.Ground || e.Pins["minus"] == n.Ground
}

// statement writes one element; nothing for a source that became a rail.
func (t *Text) statement(n *Network, e Element) string {
	at := func(pin string) string { return t.Node[e.Pins[pin]] }
	path := func(from, what, to string) string {
		return fmt.Sprintf("path %s -> %s %s -> %s\n", at(from), e.Name, what, at(to))
	}
	size := ""
	if e.Area != 1 {
		size = " size=" + number(e.Area)
	}
	switch e.Type {
	case "resistor":
		return path("a", number(e.Value), "b")
	case "current_source":
		return path("from", number(e.Value)+" A", "to")
	case "voltage_source":
		if n.grounded(e) {
			return ""
		}
		return path("minus", "cell "+number(e.Value)+" V", "plus")
	case "diode":
		return path("anode", t.Part[e.Model]+size, "cathode")
	}
	if e.Pins["collector"] == e.Pins["base"] {
		return fmt.Sprintf("place %s %s collector=%s base=%s emitter=%s%s\n",
			e.Name, t.Part[e.Model], at("collector"), at("base"), at("emitter"), size)
	}
	what := t.Part[e.Model] + " base=" + at("base") + size
	if e.Type == "pnp" {
		return path("emitter", what, "collector")
	}
	return path("collector", what, "emitter")
}

// part writes a part statement.
func part(name string, m Model) string {
	keys := []string{"Isat = " + number(m.Isat) + " A", "n = " + number(m.N)}
	switch m.Kind {
	case "npn", "pnp":
		va := "infinite"
		if m.VA != 0 {
			va = number(m.VA) + " V"
		}
		keys = append(keys, "betaF = "+number(m.BetaF), "betaR = "+number(m.BetaR), "VA = "+va)
	case "diode", "zener":
		if m.Kind == "zener" {
			keys = append(keys, "Vz = "+number(m.VZ)+" V at "+number(m.IZ0)+" A", "nz = "+number(m.NZ))
		}
		if m.RbulkR > 0 {
			keys = append(keys, "Rbulk = "+number(m.RbulkR)+" ohm")
		}
	}
	if m.Egap != 0 {
		keys = append(keys, "Egap = "+number(m.Egap)+" eV")
	}
	keys = append(keys, "T0 = "+celsius(m.KelvinRef)+" degC")
	return fmt.Sprintf("part %s %s %s\n", name, m.Kind, strings.Join(keys, ", "))
}

// number writes every digit, without the plus sign and zeros that strconv puts
// in an exponent.
func number(x float64) string {
	s := strconv.FormatFloat(x, 'g', -1, 64)
	s = strings.Replace(s, "e+0", "e", 1)
	s = strings.Replace(s, "e+", "e", 1)
	return strings.Replace(s, "e-0", "e-", 1)
}

func celsius(kelvin float64) string {
	if kelvin == room {
		return "25" // the difference below leaves rounding
	}
	return number(kelvin - 273.15)
}

// reserved are the words that no node or part may be called; a few more than
// the language needs do no harm.
var reserved = []string{
	"gnd", "GND", "load", "ambient", "infinite", "drop", "cell", "base", "row", "size", "beside", "reversed",
	"collector", "emitter", "anode", "cathode", "parallel", "sqrt", "ln", "exp", "normal", "pick", "at", "within",
}

// legal makes a name of the language that is not taken, and takes it.
func legal(name string, taken map[string]bool) string {
	clean := strings.Map(func(r rune) rune {
		if r < unicode.MaxASCII && (unicode.IsLetter(r) || unicode.IsDigit(r)) {
			return r
		}
		return '_'
	}, name)
	if clean == "" || unicode.IsDigit(rune(clean[0])) {
		clean = "n_" + clean // a word that begins with a digit may read as a quantity
	}
	out := clean
	for i := 1; taken[out] || slices.Contains(reserved, out); i++ {
		out = fmt.Sprintf("%s_%d", clean, i)
	}
	taken[out] = true
	return out
}
