package render

import (
	"io"
	"strings"
)

// A cell is one field of a table. Numbers line up by their decimal point.
type cell struct {
	text string
	ink  ink
}

// A row is cells, one a column; missing ones are empty. Lead is what begins the
// next line where a long cell pushes the rest of its row there.
type row struct {
	cells []cell
	lead  string
	head  bool // headings stand over numbers flush right
}

// A table lays out rows whose columns line up.
type table struct {
	numeric []bool // by column
	most    []int  // the widest that text may make a column; 0 for no limit
	rows    []row
}

func (t *table) add(r row) { t.rows = append(t.rows, r) }

// blank puts an empty line.
func (t *table) blank() { t.add(row{}) }

// layout finds each column's width, and for numbers the places before and after
// the point.
func (t *table) layout() (widths, before, after []int) {
	n := len(t.numeric)
	widths, before, after = make([]int, n), make([]int, n), make([]int, n)
	for _, r := range t.rows {
		for i, c := range r.cells {
			if t.numeric[i] && !r.head {
				whole, frac := split(c.text)
				before[i] = max(before[i], width(whole))
				after[i] = max(after[i], width(frac))
				continue
			}
			if w := width(c.text); t.most[i] == 0 || w <= t.most[i] {
				widths[i] = max(widths[i], w)
			}
		}
	}
	for i := range widths {
		widths[i] = max(widths[i], before[i]+after[i])
	}
	return widths, before, after
}

// split cuts a number before its point, or before its power of ten.
func split(s string) (whole, frac string) {
	if i := strings.IndexAny(s, ".e"); i >= 0 {
		return s[:i], s[i:]
	}
	return s, ""
}

// gap is the space between columns.
const gap = 2

// print writes the table.
func (t *table) print(w io.Writer, l Look) {
	widths, _, after := t.layout()
	for _, r := range t.rows {
		t.printRow(w, l, r, widths, after)
	}
}

func (t *table) printRow(w io.Writer, l Look, r row, widths, after []int) {
	var line strings.Builder
	at, end := 0, 0 // columns written, and where the next cell begins
	for i, c := range r.cells {
		text := c.text
		start := end
		switch {
		case text == "":
		case r.head && t.numeric[i]:
			start += widths[i] - width(text)
		case t.numeric[i]:
			whole, _ := split(text)
			start += widths[i] - after[i] - width(whole)
		}
		end += widths[i] + gap
		if text == "" {
			continue
		}
		if at > 0 && at >= start { // a long cell stands in the way: go on below it
			line.WriteString("\n" + r.lead)
			at = width(r.lead)
		}
		line.WriteString(strings.Repeat(" ", max(0, start-at)))
		line.WriteString(l.paint(text, c.ink))
		at = max(at, start) + width(text)
	}
	io.WriteString(w, line.String()+"\n")
}
