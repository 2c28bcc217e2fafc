package chart

import (
	"fmt"
	"math"
	"strings"

	"github.com/clipperhouse/displaywidth"

	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/solve"
	"biaswright/sweep/limits"
)

// A brush is what a sketch is drawn with.
type brush struct {
	fill  map[figure.Paint]string // of a block, barWidth wide
	spare string                  // of a transistor's spare volts
	node  string
	level string // along a rail
	mark  string // beside the scale
}

// barWidth is how wide a block is, in characters.
const barWidth = 3

var (
	full = brush{
		fill:  map[figure.Paint]string{figure.Ohmic: "▒▒▒", figure.Junction: "▓▓▓", figure.Active: "███", figure.Ideal: "│ │"},
		spare: "░░░", node: "●", level: "─", mark: "┤",
	}
	ascii = brush{
		fill:  map[figure.Paint]string{figure.Ohmic: "###", figure.Junction: "%%%", figure.Active: "@@@", figure.Ideal: "| |"},
		spare: ":::", node: "*", level: "-", mark: "|",
	}
)

// Sketch draws the headroom picture in characters, for a terminal: as Headroom does, an
// element as tall as its drop as far as lines allow. Plain keeps to ASCII, names
// and units apart.
func Sketch(p *solve.Point, plain bool) []string {
	s := newStack(p)
	return s.sketch(s.low, s.high, plain)
}

// SketchLimits draws the sketches that Limits has pictures of, one below the other, to
// one scale.
func SketchLimits(a *limits.Answer, plain bool) []string {
	ends := a.Extremes()
	var stacks []*stack
	low, high := 0.0, 0.0
	for _, e := range ends {
		s := newStack(e.Point)
		stacks = append(stacks, s)
		low, high = math.Min(low, s.low), math.Max(high, s.high)
	}
	var out []string
	for i, s := range stacks {
		if i > 0 {
			out = append(out, "")
		}
		out = append(out, endTitle(ends[i]))
		out = append(out, s.sketch(low, high, plain)...)
	}
	return out
}

// sketch draws as many columns beside each other as a screen takes, and goes on below.
func (s *stack) sketch(low, high float64, plain bool) []string {
	b := full
	if plain {
		b = ascii
	}
	if low == high {
		high = low + 1
	}
	k := &sketcher{s: s, b: b, low: low, high: high}
	k.rows = k.enough()
	k.gutter = k.scale()
	room := render.Columns - displaywidth.String(k.gutter[0])
	var out []string
	for from := 0; from < len(s.columns); {
		to, used := from, 0
		for to < len(s.columns) && (to == from || used+k.width(to) <= room) {
			used += k.width(to)
			to++
		}
		if from > 0 {
			out = append(out, "")
		}
		out = append(out, k.strip(from, to)...)
		from = to
	}
	return out
}

// A sketcher draws one stack.
type sketcher struct {
	s         *stack
	b         brush
	low, high float64
	rows      int
	gutter    []string // the scale, a line each
}

// leastRows is how tall a sketch is unless texts ask for more.
const leastRows = 20

func (k *sketcher) enough() int {
	rows := leastRows
	for i := range k.s.columns {
		rows = max(rows, len(k.s.columns[i].labels()))
	}
	return rows
}

// row is where a voltage lies, from 0 at the top to rows at the bottom.
func (k *sketcher) row(v float64) float64 {
	return (k.high - v) / (k.high - k.low) * float64(k.rows)
}

// line is the line in which a voltage lies.
func (k *sketcher) line(v float64) int {
	return max(0, min(k.rows-1, int(k.row(v))))
}

// scale writes the rails and gnd beside the lines, and a line above and below all for
// those at the ends.
func (k *sketcher) scale() []string {
	texts := make([]string, k.rows+2)
	put := func(at int, l level) {
		text := l.name
		if l.name != "gnd" {
			text = levelText(l)
		}
		if texts[at] != "" {
			text = texts[at] + ", " + text
		}
		texts[at] = text
	}
	for _, l := range k.s.levels {
		switch l.volts {
		case k.high:
			put(0, l)
		case k.low:
			put(k.rows+1, l)
		default:
			put(1+k.line(l.volts), l)
		}
	}
	widest := 0
	for _, t := range texts {
		widest = max(widest, displaywidth.String(t))
	}
	for i, t := range texts {
		mark := " "
		if t != "" {
			mark = k.b.mark
		}
		texts[i] = strings.Repeat(" ", widest-displaywidth.String(t)) + t + " " + mark
	}
	return texts
}

// width is what a column takes, the gap before it included.
func (k *sketcher) width(column int) int {
	c := &k.s.columns[column]
	w := 0
	for _, l := range c.labels() {
		w = max(w, displaywidth.String(k.text(l)))
	}
	const gaps = 3 // two before the bar, one behind it
	return gaps + barWidth*c.lanes() + w
}

func (k *sketcher) text(l label) string {
	if l.node {
		return k.b.node + " " + l.text
	}
	return "  " + l.text
}

// strip draws columns [from, to).
func (k *sketcher) strip(from, to int) []string {
	lines := make([]strings.Builder, k.rows+2)
	width := 0
	for i := from; i < to; i++ {
		width += k.width(i)
	}
	for i := range lines {
		lines[i].WriteString(k.gutter[i])
	}
	for _, at := range []int{0, k.rows + 1} {
		if strings.HasSuffix(k.gutter[at], k.b.mark) {
			lines[at].WriteString(strings.Repeat(k.b.level, width))
		}
	}
	for i := from; i < to; i++ {
		k.column(lines[1:k.rows+1], i)
	}
	out := make([]string, len(lines))
	for i := range lines {
		out[i] = strings.TrimRight(lines[i].String(), " ")
	}
	return out
}

// column adds one column to each line.
func (k *sketcher) column(lines []strings.Builder, i int) {
	c := &k.s.columns[i]
	labels := c.labels()
	var wanted []float64
	for _, l := range labels {
		wanted = append(wanted, math.Min(k.row(l.volts), float64(k.rows)-0.5))
	}
	text := make([]string, k.rows)
	for j, at := range apart(wanted, 1, 0, float64(k.rows)-0.5) {
		text[min(k.rows-1, int(at))] = k.text(labels[j])
	}
	for r := range lines {
		line := "  "
		for lane := range c.lanes() {
			line += k.bar(c, lane, r)
		}
		line = fmt.Sprintf("%s %s", line, text[r])
		lines[r].WriteString(line + strings.Repeat(" ", max(0, k.width(i)-displaywidth.String(line))))
	}
}

// bar is what stands in a lane of a column in a line: the block whose volts its middle
// lies in.
func (k *sketcher) bar(c *column, lane, row int) string {
	v := k.high - (float64(row)+0.5)/float64(k.rows)*(k.high-k.low)
	for j := range c.blocks {
		b := &c.blocks[j]
		if b.lane != lane || v > b.top() || v < b.bottom() {
			continue
		}
		if spare := b.spare(); spare > 0 && (v-b.edge)*(v-b.collector) <= 0 {
			return k.b.spare
		}
		return k.b.fill[b.kind]
	}
	return strings.Repeat(" ", barWidth)
}
