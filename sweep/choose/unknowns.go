package choose

import (
	"fmt"
	"math"
	"slices"
	"strconv"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// unknownsOf lists the open resistances, and those that are reopened, in file order.
func unknownsOf(c *netlist.Circuit, reopen []Reopening) ([]Unknown, error) {
	series := map[string]string{}
	for _, r := range reopen {
		if _, ok := quantity.Series(r.Series); !ok {
			return nil, wrong("unknown-name", diag.Span{}, "the series of IEC 60063 are E3, E6, E12, E24, E48, E96 and E192", "there is no series %s", r.Series)
		}
		if err := reopenable(c, r.Name); err != nil {
			return nil, err
		}
		series[r.Name] = r.Series
	}
	var out []Unknown
	for i := range c.Elements {
		e := &c.Elements[i]
		s, reopened := series[e.Name]
		if e.Kind != netlist.Open && !reopened {
			continue
		}
		if !reopened {
			s = e.Series
		}
		b := &c.Slots[e.Value].Bounds
		if b.Stated && b.Relative == 0 {
			return nil, wrong("bounds", e.Span, fmt.Sprintf("state it in percent: %s ? %s 1%%", e.Name, s), "the tolerance of %s is stated in ohms, and its value is still to be chosen", e.Name)
		}
		out = append(out, Unknown{
			Element: i, Name: e.Name, Series: s, Exact: math.NaN(), slot: e.Value, stated: c.Value(e.Value),
		})
	}
	if len(out) == 0 {
		return nil, wrong("no-open-value", diag.Span{File: c.File}, "write RE ? E24 in the file, or --reopen RE=E24", "no value is open, so there is nothing to choose")
	}
	return out, nil
}

// reopenable tells what stands in the way of choosing an element's value.
func reopenable(c *netlist.Circuit, name string) error {
	var resistors []string
	for i := range c.Elements {
		e := &c.Elements[i]
		switch e.Kind {
		case netlist.Resistor, netlist.Link, netlist.Open:
			if e.Name == name {
				return nil
			}
			resistors = append(resistors, e.Name)
		default:
			if e.Name == name {
				return wrong("wrong-place", e.Span, "", "%s is no resistor, and only a resistance is chosen", name)
			}
		}
	}
	return wrong("unknown-name", diag.Span{}, diag.DidYouMean(name, resistors), "there is no resistor %s", name)
}

// withValues gives every unknown a number of its own.
func withValues(c *netlist.Circuit, unknowns []Unknown, ohms []float64) (*netlist.Circuit, error) {
	settings := make([]netlist.Setting, len(unknowns))
	for i := range unknowns {
		settings[i] = netlist.Setting{Name: unknowns[i].Name, Value: strconv.FormatFloat(ohms[i], 'g', -1, 64)}
	}
	out, list := c.With(settings...)
	if list.HasErrors() {
		d := list[slices.IndexFunc(list, func(d diag.Diagnostic) bool { return d.Severity == diag.Error })]
		return nil, &Error{Code: d.Code, Message: d.Message, Hint: d.Hint, Span: d.Span}
	}
	return out, nil
}

// SeriesOf lists the series that a resistance belongs to, from coarse to fine. E24 is
// no part of E48 to E192, so that the list may have gaps.
func SeriesOf(ohms float64) []string {
	var out []string
	for _, name := range quantity.SeriesNames {
		s, _ := quantity.Series(name)
		if below, _ := s.Neighbours(ohms); below == ohms {
			out = append(out, name)
		}
	}
	return out
}

// layGrid lists the values of each series from a tenth of the exact value to ten times
// it, or so many around it that no more than most combinations are left.
func (a *Answer) layGrid(most int) {
	a.Combinations = 1
	for i := range a.Unknowns {
		u := &a.Unknowns[i]
		const decade = 10
		u.grid = preferred(u.Series, u.Exact/decade, u.Exact*decade)
		a.Combinations = product(a.Combinations, len(u.grid))
	}
	if a.Combinations > most {
		a.narrow(most)
	}
	for i := range a.Unknowns {
		u := &a.Unknowns[i]
		u.Low, u.High, u.Count = u.grid[0], u.grid[len(u.grid)-1], len(u.grid)
	}
}

// product of two counts, at most the largest int.
func product(a, b int) int {
	if b > 0 && a > math.MaxInt/b {
		return math.MaxInt
	}
	return a * b
}

// narrow leaves of each grid the values nearest to the exact one, the longest grids
// first.
func (a *Answer) narrow(most int) {
	a.Whole = false
	for {
		total, longest := 1, &a.Unknowns[0]
		for i := range a.Unknowns {
			u := &a.Unknowns[i]
			total = product(total, len(u.grid))
			if len(u.grid) > len(longest.grid) {
				longest = u
			}
		}
		if a.Combinations = total; total <= most || len(longest.grid) == 1 {
			return
		}
		g := longest.grid
		if longest.Exact/g[0] > g[len(g)-1]/longest.Exact {
			longest.grid = g[1:]
		} else {
			longest.grid = g[:len(g)-1]
		}
	}
}

// preferred lists the values of a series from low to high, in ohms, rising.
func preferred(series string, low, high float64) []float64 {
	s, _ := quantity.Series(series)
	var out []float64
	for _, v := s.Neighbours(low); v <= high; {
		out = append(out, v)
		_, v = s.Neighbours(math.Nextafter(v, math.Inf(1)))
	}
	return out
}
