// Package sweep solves a circuit over axes: rails, element values, part parameters,
// ambient, the load's voltage, the count of a row. The inner axis is followed on
// its branch, point from point; outer axes are shared out to workers. Rows come in
// input order and are the same whatever the number of workers.
package sweep

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
)

// An Axis is what is swept, and over which values.
type Axis struct {
	// Name is the axis as a table heads it: "VCC.V", "ambient", "RE",
	// "gp.betaF", "load.V", "LAMP.row", "VCC.V+VREF.V".
	Name   string
	Unit   quantity.Unit
	Values []float64 // in Unit; degrees Celsius for a temperature
	// names are what a setting calls the slots moved together; row is the
	// element whose count is set instead, or "".
	names []string
	row   string
}

// An Error is what is wrong with an axis, with a hint where one helps.
type Error struct{ Message, Hint string }

func (e *Error) Error() string { return e.Message }

func wrong(hint, format string, args ...any) error {
	return &Error{Message: fmt.Sprintf(format, args...), Hint: hint}
}

// longestAxis bounds one axis; a million points are a second or so.
const longestAxis = 10_000_000

// ParseAxis reads NAME=FROM..TO, taken in points steps, evenly or by equal ratios,
// or NAME=VALUE,VALUE,…; NAME may be rails joined by + that move together, and
// ELEMENT.row counts in whole numbers. An axis load.V wants a circuit whose load is
// held (netlist.Circuit.HoldLoad). The error is an *Error.
func ParseAxis(c *netlist.Circuit, text string, points int, logarithmic bool) (Axis, error) {
	name, values, ok := strings.Cut(text, "=")
	name = strings.TrimSpace(name)
	if !ok || name == "" || strings.TrimSpace(values) == "" {
		return Axis{}, wrong("write VCC=5V..15V, or VCC=5V,9V,12V", "%q is no axis", text)
	}
	a := Axis{}
	if err := a.bind(c, name); err != nil {
		return Axis{}, err
	}
	from, to, ranged := strings.Cut(values, "..")
	if !ranged {
		if logarithmic {
			return Axis{}, wrong("a list is taken as it stands", "%s is a list, which has no logarithmic steps", a.Name)
		}
		return a, a.list(c, values)
	}
	low, err := a.value(c, from)
	if err != nil {
		return Axis{}, err
	}
	high, err := a.value(c, to)
	if err != nil {
		return Axis{}, err
	}
	switch {
	case a.row != "":
		err = a.count(low, high)
	case points < 1 || points > longestAxis:
		err = wrong("", "%s over %d points: from 1 to %d are possible", a.Name, points, longestAxis)
	case logarithmic:
		err = a.ratios(low, high, points)
	default:
		a.even(low, high, points)
	}
	return a, err
}

// NewAxis is the axis of that name, as ParseAxis reads it, over the values given, in
// the axis's unit. The caller keeps them as they are. The error is an *Error.
func NewAxis(c *netlist.Circuit, name string, values []float64) (Axis, error) {
	a := Axis{Values: values}
	return a, a.bind(c, name)
}

// bind finds what the name moves.
func (a *Axis) bind(c *netlist.Circuit, name string) error {
	if element, ok := strings.CutSuffix(name, ".row"); ok {
		a.Name, a.row, a.Unit = name, element, quantity.One
		_, err := setting(c, name, "1")
		return err
	}
	var heads []string
	for _, part := range strings.Split(name, "+") {
		part = strings.TrimSpace(part)
		id, ok := c.Lookup(part)
		if !ok {
			return wrong(diag.DidYouMean(part, c.Names()), "there is no value %s to sweep", part)
		}
		if math.IsNaN(c.Value(id)) {
			return wrong("", "%s is not stated; another parameter stands for it", part)
		}
		unit := c.Slots[id].Unit
		if len(a.names) > 0 && unit != a.Unit {
			return wrong("", "%s is in %s, %s in %s: they cannot move together", a.names[0], a.Unit.Words(), part, unit.Words())
		}
		a.Unit, a.names = unit, append(a.names, part)
		heads = append(heads, heading(c, part))
	}
	a.Name = strings.Join(heads, "+")
	return nil
}

// heading writes a rail as VCC.V, whichever way it was typed.
func heading(c *netlist.Circuit, name string) string {
	for i := range c.Rails {
		if r := c.Rails[i].Name; name == r || name == r+".V" {
			return r + ".V"
		}
	}
	return name
}

// setting applies one setting, and turns what the language says into an error.
func setting(c *netlist.Circuit, name, value string) (*netlist.Circuit, error) {
	out, list := c.With(netlist.Setting{Name: name, Value: value})
	if list.HasErrors() {
		return nil, wrong(list[0].Hint, "%s", list[0].Message)
	}
	return out, nil
}

// value reads one value of the axis as a setting would.
func (a *Axis) value(c *netlist.Circuit, text string) (float64, error) {
	text = strings.TrimSpace(text)
	if a.row != "" {
		n, err := strconv.Atoi(text)
		if err != nil {
			return 0, wrong("write "+a.Name+"=1..6", "%s counts in whole numbers, and %q is none", a.Name, text)
		}
		_, err = setting(c, a.Name, text)
		return float64(n), err
	}
	changed, err := setting(c, a.names[0], text)
	if err != nil {
		return 0, err
	}
	id, _ := changed.Lookup(a.names[0])
	v := changed.Value(id)
	if math.IsInf(v, 0) {
		return 0, wrong("", "%s: infinite is no value to sweep over", a.Name)
	}
	return v, nil
}

func (a *Axis) list(c *netlist.Circuit, text string) error {
	for _, item := range strings.Split(text, ",") {
		v, err := a.value(c, item)
		if err != nil {
			return err
		}
		a.Values = append(a.Values, v)
	}
	return nil
}

// count takes every whole number of the range, in its sense.
func (a *Axis) count(from, to float64) error {
	step := 1.0
	if to < from {
		step = -1
	}
	for v := from; v != to+step; v += step {
		a.Values = append(a.Values, v)
	}
	return nil
}

func (a *Axis) even(from, to float64, points int) {
	for i := range points {
		a.Values = append(a.Values, between(from, to, i, points))
	}
}

// between is point i of points from one end to the other, exact at both.
func between(from, to float64, i, points int) float64 {
	switch {
	case i == 0:
		return from
	case i == points-1:
		return to
	}
	f := float64(i) / float64(points-1)
	return (1-f)*from + f*to
}

func (a *Axis) ratios(from, to float64, points int) error {
	if !(from*to > 0) {
		return wrong("both ends on one side of 0", "%s: a logarithmic range cannot touch or cross 0", a.Name)
	}
	for i := range points {
		switch i {
		case 0:
			a.Values = append(a.Values, from)
		case points - 1:
			a.Values = append(a.Values, to)
		default:
			a.Values = append(a.Values, byRatio(from, to, float64(i)/float64(points-1)))
		}
	}
	return nil
}

// byRatio is from (to/from)^f.
func byRatio(from, to, f float64) float64 {
	if ratio := to / from; ratio != 0 && !math.IsInf(ratio, 0) {
		return from * math.Pow(ratio, f)
	}
	// In two halves: the ratio is more than a double holds.
	half := math.Pow(math.Sqrt(math.Abs(to))/math.Sqrt(math.Abs(from)), f)
	return from * half * half
}

// settings are the settings that put value i in force, exact to the last digit.
func (a *Axis) settings(i int) []netlist.Setting {
	text := strconv.FormatFloat(a.Values[i], 'g', -1, 64)
	if a.row != "" {
		return []netlist.Setting{{Name: a.Name, Value: text}}
	}
	out := make([]netlist.Setting, len(a.names))
	for k, name := range a.names {
		out[k] = netlist.Setting{Name: name, Value: text}
	}
	return out
}

// slots are the axis's slots in c; none for a row. Two circuits of one text have
// the same slots in the same places unless a row's count differs.
func (a *Axis) slots(c *netlist.Circuit) []netlist.SlotID {
	out := make([]netlist.SlotID, len(a.names))
	for k, name := range a.names {
		out[k], _ = c.Lookup(name)
	}
	return out
}

// Overlaps tells whether two axes move one value.
func (a *Axis) Overlaps(c *netlist.Circuit, b *Axis) bool {
	if a.row != "" || b.row != "" {
		return a.row == b.row
	}
	mine := a.slots(c)
	return slices.ContainsFunc(b.slots(c), func(id netlist.SlotID) bool { return slices.Contains(mine, id) })
}

// inside tells whether a value lies in a slot's stated range; where none is stated,
// only the nominal value does.
func inside(s *netlist.Slot, v float64) bool {
	low, high := s.Value, s.Value
	if s.Bounds.Stated {
		low, high = s.Bounds.Low, s.Bounds.High
	}
	const rounding = 1e-12 // of a range's end, for ends that are steps
	return v >= low-rounding*math.Abs(low) && v <= high+rounding*math.Abs(high)
}

// rowInside is inside for a count: the one in force.
func (a *Axis) rowInside(c *netlist.Circuit, v float64) bool {
	for i := range c.Elements {
		if e := &c.Elements[i]; e.Name == a.row {
			return float64(e.Row) == v
		}
	}
	return false
}

// IsError finds an *Error in err.
func IsError(err error) (*Error, bool) {
	var e *Error
	return e, errors.As(err, &e)
}
