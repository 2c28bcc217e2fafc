package render

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"

	"biaswright/netlist"
)

// Parts prints the parts of shelves, kind by kind: name, what the model states,
// and ratings.
func Parts(out io.Writer, shelves []*netlist.Circuit, l Look) error {
	w := &writer{w: out}
	for n, kind := range kindsOf(shelves) {
		if n > 0 {
			fmt.Fprintln(w)
		}
		fmt.Fprintln(w, l.paint(kind, bold))
		for _, c := range shelves {
			for i := range c.Parts {
				if p := &c.Parts[i]; p.Kind.Name == kind {
					printPart(w, c, p, l)
				}
			}
		}
	}
	fmt.Fprintln(w)
	wrap(w, "", "Where each value is from: biaswright parts --source")
	return w.err
}

// kindsOf lists the kinds of the parts, as they first occur.
func kindsOf(shelves []*netlist.Circuit) []string {
	var kinds []string
	for _, c := range shelves {
		for i := range c.Parts {
			if k := c.Parts[i].Kind.Name; !slices.Contains(kinds, k) {
				kinds = append(kinds, k)
			}
		}
	}
	return kinds
}

func printPart(w io.Writer, c *netlist.Circuit, p *netlist.Part, l Look) {
	const room = 12 // for the longest usual name, so that figures line up
	model, ratings := figures(c, p)
	head := fmt.Sprintf("  %-*s ", room, p.Name)
	flow(w, head, commas(model, l))
	if len(ratings) > 0 {
		flow(w, strings.Repeat(" ", width(head)), commas(ratings, l))
	}
}

// commas puts a comma behind each figure but the last; a figure keeps to one
// line.
func commas(figures []string, l Look) []string {
	out := make([]string, len(figures))
	for i, f := range figures {
		out[i] = l.text(f)
		if i < len(figures)-1 {
			out[i] += ","
		}
	}
	return out
}

// figures writes what a part states, model and ratings apart: "Vbe 0.65 V at
// 1 mA", "Pmax 500 mW".
func figures(c *netlist.Circuit, p *netlist.Part) (model, ratings []string) {
	for i, prm := range p.Kind.Params {
		slot := &c.Slots[p.Params[i]]
		if !slot.Stated || prm.Hidden || math.IsNaN(slot.Value) {
			continue
		}
		text := prm.Name + " " + stated(slot.Value, prm.Unit.Symbol())
		if prm.At != "" {
			at := p.Kind.Index(prm.At)
			text += " at " + stated(c.Slots[p.Params[at]].Value, p.Kind.Params[at].Unit.Symbol())
		}
		if slot.Bounds.Stated {
			text += " (" + rangeText(slot.Bounds, prm.Unit.Symbol()) + ")"
		}
		if prm.Rating {
			ratings = append(ratings, text)
			continue
		}
		model = append(model, text)
	}
	return model, ratings
}

type partsJSON struct {
	Schema string     `json:"schema"`
	Parts  []partJSON `json:"parts"`
}

type partJSON struct {
	Name    string           `json:"name"`
	Kind    string           `json:"kind"`
	Model   list[figureJSON] `json:"model"`
	Ratings list[figureJSON] `json:"ratings"`
}

type figureJSON struct {
	Value num    `json:"value"`
	Unit  string `json:"unit"`
	// At is the current of a stated point, in A.
	At *num `json:"at,omitempty"`
	// Reason says why Value is null.
	Reason string `json:"reason,omitempty"`
}

// PartsJSON gives the parts of shelves, in the form of PartsSchema.
func PartsJSON(shelves []*netlist.Circuit) any {
	j := partsJSON{Schema: PartsSchema, Parts: []partJSON{}}
	for _, c := range shelves {
		for i := range c.Parts {
			j.Parts = append(j.Parts, partFigures(c, &c.Parts[i]))
		}
	}
	return j
}

func partFigures(c *netlist.Circuit, p *netlist.Part) partJSON {
	j := partJSON{Name: p.Name, Kind: p.Kind.Name, Model: list[figureJSON]{}, Ratings: list[figureJSON]{}}
	for i, prm := range p.Kind.Params {
		slot := &c.Slots[p.Params[i]]
		if !slot.Stated || prm.Hidden || math.IsNaN(slot.Value) {
			continue
		}
		f := figureJSON{Value: num(slot.Value), Unit: prm.Unit.String()}
		if math.IsInf(slot.Value, 0) {
			f.Reason = "infinite"
		}
		if prm.At != "" {
			at := num(c.Slots[p.Params[p.Kind.Index(prm.At)]].Value)
			f.At = &at
		}
		if prm.Rating {
			j.Ratings.add(prm.Name, f)
			continue
		}
		j.Model.add(prm.Name, f)
	}
	return j
}
