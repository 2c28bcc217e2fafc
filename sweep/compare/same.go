package compare

import (
	"fmt"
	"slices"

	"biaswright/netlist"
	"biaswright/netlist/quantity"
)

// A Difference is what two files do not state alike.
type Difference struct {
	What  string // "target", "rail VCC", "ambient", "load"
	First string // what the first file has, as --set would write it; "" for nothing
	Other string
}

// Differences are what keeps two files from being for one job: targets, rails, ambient
// temperatures and loads. Titles, topologies and the parts that are not the load may
// differ.
func Differences(a, b *netlist.Circuit) []Difference {
	var out []Difference
	differ := func(what, x, y string) {
		if x != y {
			out = append(out, Difference{what, x, y})
		}
	}
	differ("target", targetOf(a), targetOf(b))
	names := railNames(a)
	for _, n := range railNames(b) {
		if !slices.Contains(names, n) {
			names = append(names, n)
		}
	}
	for _, n := range names {
		differ("rail "+n, railOf(a, n), railOf(b, n))
	}
	differ("ambient", slotText(a, a.Ambient), slotText(b, b.Ambient))
	differ("load", loadOf(a), loadOf(b))
	return out
}

func targetOf(c *netlist.Circuit) string {
	if len(c.Targets) == 0 {
		return ""
	}
	t := &c.Targets[0]
	within := written(t.Within, t.Q.Unit)
	if t.Relative {
		const percent = 100
		within = fmt.Sprintf("%.6g %%", percent*t.Within)
	}
	return fmt.Sprintf("%s = %s within %s", t.Q.Text, written(t.Value, t.Q.Unit), within)
}

// written gives a number as the language has it.
func written(value float64, unit quantity.Unit) string {
	const digits = 6 // as many as anybody states
	return quantity.FormatASCII(quantity.Quantity{Value: value, Unit: unit}, digits)
}

func railNames(c *netlist.Circuit) []string {
	var out []string
	for i := range c.Rails {
		out = append(out, c.Rails[i].Name)
	}
	return out
}

func railOf(c *netlist.Circuit, name string) string {
	for i := range c.Rails {
		if c.Rails[i].Name == name {
			return slotText(c, c.Rails[i].Volts)
		}
	}
	return ""
}

func slotText(c *netlist.Circuit, id netlist.SlotID) string {
	s := &c.Slots[id]
	text := written(s.Value, s.Unit)
	if s.Bounds.Stated {
		text += " (" + written(s.Bounds.Low, s.Unit) + " .. " + written(s.Bounds.High, s.Unit) + ")"
	}
	return text
}

// loadOf tells what the load is made of, whatever its elements are called.
func loadOf(c *netlist.Circuit) string {
	text := ""
	for _, i := range c.Load {
		e := &c.Elements[i]
		if text != "" {
			text += ", "
		}
		switch {
		case e.Value != netlist.None:
			text += slotText(c, e.Value)
		case e.Part != netlist.None:
			kind := c.Parts[e.Part].Kind
			text += fmt.Sprintf("%s ×%d", kind.Name, e.Row)
			for k, id := range e.Params {
				if s := &c.Slots[id]; s.Stated {
					text += fmt.Sprintf(" %s=%.6g", kind.Params[k].Name, s.Value)
				}
			}
		}
	}
	return text
}
