package render

import (
	"fmt"
	"io"
	"math"
	"strconv"

	"biaswright/netlist"
	"biaswright/solve/interval"
)

// enclosed are the figures of an enclosure, in the file's order.
func enclosed(a *Answer, each func(name, unit string, v interval.I)) {
	c := a.Circuit
	for n := 1; n < len(c.Nodes); n++ {
		if c.Nodes[n].Rail < 0 {
			each(c.Nodes[n].Name+".V", "V", a.Enclosure.NodeV[n])
		}
	}
	for i := range c.Elements {
		symbols := []string{"I"}
		if c.Elements[i].Kind == netlist.TransistorPart {
			symbols = []string{"Ic", "Ib", "Ie"}
		}
		for _, symbol := range symbols {
			if v, ok := a.Enclosure.Current(i, symbol); ok {
				each(c.Elements[i].Name+"."+symbol, "A", v)
			}
		}
	}
	for i := range c.Rails {
		each(c.Rails[i].Name+".I", "A", a.Enclosure.Rail[i])
	}
}

// printEnclosure prints each figure as its middle and how far the exact solution can be
// from it.
func printEnclosure(w io.Writer, a *Answer, l Look) {
	if a.NoEnclosure != "" {
		wrap(w, "", l.text(a.NoEnclosure+"."))
		fmt.Fprintln(w)
	}
	if a.Enclosure == nil {
		return
	}
	t := table{numeric: []bool{false, false, false}, most: []int{0, 0, 0}}
	t.add(row{head: true, cells: []cell{{l.text("Enclosures"), bold}, {l.text("middle"), faint}, {l.text("no further off than"), faint}}})
	enclosed(a, func(name, unit string, v interval.I) {
		// The middle is printed with the digits that the width leaves, and what
		// printing rounds counts too.
		middle := v.Mid()
		text := strconv.FormatFloat(middle, 'g', -1, 64)
		off := math.Max(interval.Up(v.Hi-middle), interval.Up(middle-v.Lo))
		t.add(row{cells: []cell{{l.text("  " + name), noInk}, {l.text(text + " " + unit), noInk}, {l.text(power(off*1.05, 1) + " " + unit), noInk}}})
	})
	t.print(w, l)
	fmt.Fprintln(w)
}

// encloseJSON holds the two ends of each figure, rounded outward.
type encloseJSON struct {
	Figures list[[2]num] `json:"figures"`
}

func enclosure(a *Answer) *encloseJSON {
	j := &encloseJSON{Figures: list[[2]num]{}}
	enclosed(a, func(name, _ string, v interval.I) { j.Figures.add(name, [2]num{num(v.Lo), num(v.Hi)}) })
	return j
}
