package chart

import (
	"math"
	"strconv"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist/quantity"
)

// An axis maps values to places along one edge of a plot, and says which values are
// written there.
type axis struct {
	low, high float64 // values, low < high
	from, to  float64 // places in points: of low and of high
	log       bool
	ten       int // the power of ten of the prefix that the numbers are written in
	symbol    string
	ticks     []float64
	labels    []string
}

// newAxis spans values from low to high, with at most so many ticks. The unit's
// symbol takes one fixed prefix where it takes any.
func newAxis(low, high float64, unit string, logarithmic bool, most int) *axis {
	a := &axis{low: low, high: high, log: logarithmic, symbol: unit}
	if render.Prefixable(unit) {
		const enough = 3 // digits by which the largest number is judged
		p := quantity.CommonPrefix([]float64{low, high}, enough)
		a.ten, a.symbol = p.Ten, p.Symbol+unit
	}
	if logarithmic {
		a.decades(most)
	} else {
		a.even(most)
	}
	return a
}

// title is "VCC.V [V]".
func (a *axis) title(name string) string {
	if a.symbol == "" {
		return name
	}
	return name + " [" + a.symbol + "]"
}

// step is the smallest of 1, 2 and 5 times a power of ten of which at most so many
// fit into a range.
func step(width float64, most int) float64 {
	raw := width / float64(most)
	ten := math.Pow(10, math.Floor(math.Log10(raw)))
	for _, m := range []float64{1, 2, 5} {
		if m*ten >= raw*(1-1e-9) { // a range that fits but for rounding does fit
			return m * ten
		}
	}
	return 10 * ten
}

func (a *axis) even(most int) {
	s := step(a.high-a.low, most)
	const slack = 1e-9 // of a step, so that the ends get theirs
	first, last := math.Ceil(a.low/s-slack), math.Floor(a.high/s+slack)
	for first > last { // none falls inside: the next smaller step
		s = step(s/2.5, 1) // from 5 to 2, from 2 to 1, from 1 to 0.5
		first, last = math.Ceil(a.low/s-slack), math.Floor(a.high/s+slack)
	}
	decimals := max(0, a.ten-int(math.Floor(math.Log10(s)+slack)))
	for k := first; k <= last; k++ {
		v := k * s
		if k == 0 {
			v = 0 // not -0
		}
		a.ticks = append(a.ticks, v)
		a.labels = append(a.labels, strconv.FormatFloat(shifted(v, -a.ten), 'f', decimals, 64))
	}
}

// shifted is v times 10^n, by a division where that keeps exact powers exact.
func shifted(v float64, n int) float64 {
	if n < 0 {
		return v / math.Pow10(-n)
	}
	return v * math.Pow10(n)
}

// decades puts ticks at powers of ten, and at 2 and 5 times them where they are few.
func (a *axis) decades(most int) {
	span := math.Log10(a.high / a.low)
	steps := []float64{1}
	const perDecade = 3
	if span*perDecade <= float64(most) {
		steps = []float64{1, 2, 5}
	}
	every := max(1, int(math.Ceil(span/float64(most))))
	const slack = 1e-9
	for d := int(math.Floor(math.Log10(a.low))); float64(d) <= math.Log10(a.high)+slack; d++ {
		if d%every != 0 {
			continue
		}
		for _, m := range steps {
			v := m * math.Pow10(d)
			if v < a.low*(1-slack) || v > a.high*(1+slack) {
				continue
			}
			a.ticks = append(a.ticks, v)
			a.labels = append(a.labels, strconv.FormatFloat(shifted(v, -a.ten), 'g', -1, 64))
		}
	}
}

// place is where a value stands.
func (a *axis) place(v float64) float64 {
	share := (v - a.low) / (a.high - a.low)
	if a.log {
		share = math.Log(v/a.low) / math.Log(a.high/a.low)
	}
	return a.from + share*(a.to-a.from)
}

// clamp is place for values that may lie beyond the ends.
func (a *axis) clamp(v float64) float64 {
	if a.log && v <= 0 {
		return a.from
	}
	return a.place(math.Min(math.Max(v, a.low), a.high))
}

// labelWidth is the width of the widest number.
func (a *axis) labelWidth() float64 {
	widest := 0.0
	for _, l := range a.labels {
		widest = math.Max(widest, textRoom(l, small, false))
	}
	return widest
}

// Sizes of text, in points.
const (
	small  = 11.0 // numbers and notes
	normal = 12.0 // names
	large  = 15.0 // the title
	line   = 1.3  // a line's height over its text's size
)
