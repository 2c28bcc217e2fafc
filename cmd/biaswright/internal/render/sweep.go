package render

import (
	"fmt"
	"io"
	"math"
	"strconv"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/solve"
	"biaswright/sweep"
)

// A SweepAnswer is what the sweep command has to show besides its rows.
type SweepAnswer struct {
	File     string
	Circuit  *netlist.Circuit
	Set      []netlist.Setting
	Axes     []sweep.Axis
	Show     []*netlist.Expr
	Tally    Tally
	Failure  *solve.Failure // nothing could be swept
	Warnings diag.List
}

// A Tally counts rows.
type Tally struct {
	Rows, Failed, Unstable int
	// Inside counts the rows in the stated ranges, Unmet those of them at which
	// a requirement is not met or there is no point.
	Inside, Unmet int
}

// Add counts one row.
func (t *Tally) Add(row sweep.Row) {
	t.Rows++
	switch row.Status {
	case sweep.Failed:
		t.Failed++
	case sweep.Unstable:
		t.Unstable++
	}
	if row.Inside {
		t.Inside++
		if row.Unmet > 0 || row.Status == sweep.Failed {
			t.Unmet++
		}
	}
}

// A RowPrinter takes rows as they come, and ends the answer.
type RowPrinter interface {
	Row(sweep.Row) error
	End() error
}

// A CSV prints rows as comma-separated values. Each write holds whole rows, so that
// a run which is interrupted leaves no part of one.
type CSV struct {
	w   io.Writer
	buf []byte
}

// csvChunk is how many bytes are gathered before they are written: what a pipe
// takes at a stroke or not at all (PIPE_BUF on Linux; POSIX asks for less).
const csvChunk = 4096

// NewCSV begins with the header.
func NewCSV(w io.Writer, a *SweepAnswer) *CSV {
	c := &CSV{w: w, buf: make([]byte, 0, 2*csvChunk)}
	for i := range a.Axes {
		c.buf = appendHead(c.buf, a.Axes[i].Name, a.Axes[i].Unit)
	}
	for _, e := range a.Show {
		c.buf = appendHead(c.buf, e.Text, e.Unit)
	}
	c.buf = append(c.buf, "status\n"...)
	return c
}

// appendHead adds a column's name with its unit, quoted where it holds a comma.
func appendHead(b []byte, name string, unit quantity.Unit) []byte {
	head := columnName(name, unit)
	for _, c := range head {
		if c == ',' || c == '"' {
			return append(strconv.AppendQuote(b, head), ',')
		}
	}
	return append(append(b, head...), ',')
}

// columnName is "VCC.V [V]"; a plain number has no unit.
func columnName(name string, unit quantity.Unit) string {
	name = ascii.Replace(name)
	if u := unit.String(); u != "" {
		return name + " [" + u + "]"
	}
	return name
}

// Row adds a row.
func (c *CSV) Row(row sweep.Row) error {
	start := len(c.buf)
	for _, v := range row.At {
		c.buf = append(strconv.AppendFloat(c.buf, v, 'g', -1, 64), ',')
	}
	for _, v := range row.Values {
		c.buf = append(strconv.AppendFloat(c.buf, v, 'g', -1, 64), ',')
	}
	c.buf = append(append(c.buf, row.Status...), '\n')
	if len(c.buf) <= csvChunk {
		return nil
	}
	if start == 0 { // a row longer than a chunk
		return c.End()
	}
	if _, err := c.w.Write(c.buf[:start]); err != nil {
		return err
	}
	c.buf = append(c.buf[:0], c.buf[start:]...)
	return nil
}

// End writes what is left.
func (c *CSV) End() error {
	_, err := c.w.Write(c.buf)
	c.buf = c.buf[:0]
	return err
}

// A sweepScreen gathers rows into a table for people.
type sweepScreen struct {
	w    *writer
	a    *SweepAnswer
	look Look
	rows []sweep.Row
}

// NewSweepScreen begins a table for people.
func NewSweepScreen(w io.Writer, a *SweepAnswer, l Look) RowPrinter {
	return &sweepScreen{w: &writer{w: w}, a: a, look: l}
}

func (s *sweepScreen) Row(row sweep.Row) error {
	s.rows = append(s.rows, row)
	return nil
}

// End prints the table: one prefix a column, marks behind rows that are out of the
// ordinary, and what was counted.
func (s *sweepScreen) End() error {
	printTitle(s.w, &Answer{File: s.a.File, Circuit: s.a.Circuit, Set: s.a.Set}, s.look)
	if s.a.Failure != nil {
		printFailure(s.w, s.a.Failure, s.look)
		return s.w.err
	}
	axes, show := len(s.a.Axes), len(s.a.Show)
	t := table{numeric: make([]bool, axes+show+1), most: make([]int, axes+show+1)}
	head := make([]cell, 0, axes+show+1)
	scales := make([]scale, axes+show)
	for i := range scales {
		t.numeric[i] = true
		var name, unit string
		if i < axes {
			name, unit = s.a.Axes[i].Name, s.a.Axes[i].Unit.Symbol()
		} else {
			name, unit = s.a.Show[i-axes].Text, s.a.Show[i-axes].Unit.Symbol()
		}
		if Prefixable(unit) {
			scales[i] = scaleFor(s.column(i)...)
		}
		if unit != "" {
			name = heading(name, scales[i], unit)
		}
		head = append(head, cell{s.look.text(name), bold})
	}
	t.add(row{head: true, cells: append(head, cell{})})
	for _, r := range s.rows {
		cells := make([]cell, 0, axes+show+1)
		for i := range scales {
			cells = append(cells, cell{number(scales[i].in(s.value(r, i))), noInk})
		}
		t.add(row{cells: append(cells, mark(r))})
	}
	t.print(s.w, s.look)
	fmt.Fprintln(s.w)
	wrap(s.w, "", s.look.text(tallyText(&s.a.Tally)))
	return s.w.err
}

func (s *sweepScreen) value(r sweep.Row, column int) float64 {
	if column < len(r.At) {
		return r.At[column]
	}
	return r.Values[column-len(r.At)]
}

func (s *sweepScreen) column(i int) []float64 {
	out := make([]float64, len(s.rows))
	for k, r := range s.rows {
		out[k] = s.value(r, i)
	}
	return out
}

// mark says in a word what is out of the ordinary in a row.
func mark(r sweep.Row) cell {
	switch {
	case r.Status == sweep.Failed:
		return cell{"no point", bad}
	case r.Status == sweep.Unstable:
		return cell{"unstable", bad}
	case r.Inside && r.Unmet > 0:
		return cell{"NOT MET", bad}
	case !r.Inside:
		return cell{"outside", faint}
	}
	return cell{}
}

func tallyText(t *Tally) string {
	says := count(t.Rows, "point")
	if t.Failed > 0 {
		says += fmt.Sprintf(", %d without an operating point", t.Failed)
	}
	if t.Unstable > 0 {
		says += fmt.Sprintf(", %d that cannot be stable", t.Unstable)
	}
	switch {
	case t.Inside == 0:
		says += "; none inside the stated ranges"
	case t.Unmet > 0:
		says += fmt.Sprintf("; of %d inside the stated ranges %d do not meet all that is asked", t.Inside, t.Unmet)
	default:
		says += fmt.Sprintf("; the %d inside the stated ranges meet all that is asked", t.Inside)
	}
	return says + "."
}

// SweepSchema names the JSON form of sweep.
const SweepSchema = "biaswright.sweep/1"

type sweepJSON struct {
	Schema   string          `json:"schema"`
	File     string          `json:"file"`
	Title    string          `json:"title"`
	Set      *list[string]   `json:"set,omitempty"`
	Points   *[]pointJSON    `json:"points,omitempty"` // empty, with a failure
	Failure  *failureJSON    `json:"failure,omitempty"`
	Axes     []sweepAxisJSON `json:"axes"`
	Show     []showJSON      `json:"show"`
	Rows     []sweepRowJSON  `json:"rows"`
	Counts   tallyJSON       `json:"counts"`
	Warnings diag.List       `json:"warnings"`
}

type sweepAxisJSON struct {
	Axis   string `json:"axis"`
	Unit   string `json:"unit"`
	Values []num  `json:"values"`
}

type showJSON struct {
	Quantity string `json:"quantity"`
	Unit     string `json:"unit"`
}

type sweepRowJSON struct {
	At     list[num] `json:"at"`
	Values list[num] `json:"values"`
	Status string    `json:"status"`
	Inside bool      `json:"inside"`
	Unmet  int       `json:"unmet"`
	// Reason says why a value is null.
	Reason string `json:"reason,omitempty"`
}

type tallyJSON struct {
	Rows     int `json:"rows"`
	Failed   int `json:"failed"`
	Unstable int `json:"unstable"`
	Inside   int `json:"inside"`
	Unmet    int `json:"unmet"`
}

type sweepObject struct {
	w io.Writer
	a *SweepAnswer
	j sweepJSON
}

// NewSweepJSON begins the answer for scripts.
func NewSweepJSON(w io.Writer, a *SweepAnswer) RowPrinter {
	o := &sweepObject{w: w, a: a}
	o.j = sweepJSON{
		Schema: SweepSchema, File: a.File, Title: a.Circuit.Title, Set: settings(a.Set),
		Axes: []sweepAxisJSON{}, Show: []showJSON{}, Rows: []sweepRowJSON{}, Warnings: append(diag.List{}, a.Warnings...),
	}
	for i := range a.Axes {
		x := sweepAxisJSON{Axis: a.Axes[i].Name, Unit: a.Axes[i].Unit.String(), Values: []num{}}
		for _, v := range a.Axes[i].Values {
			x.Values = append(x.Values, num(v))
		}
		o.j.Axes = append(o.j.Axes, x)
	}
	for _, e := range a.Show {
		o.j.Show = append(o.j.Show, showJSON{e.Text, e.Unit.String()})
	}
	return o
}

func (o *sweepObject) Row(r sweep.Row) error {
	j := sweepRowJSON{Status: string(r.Status), Inside: r.Inside, Unmet: r.Unmet}
	for i, v := range r.At {
		j.At.add(o.a.Axes[i].Name, num(v))
	}
	for i, v := range r.Values {
		j.Values.add(o.a.Show[i].Text, num(v))
		if math.IsNaN(v) {
			j.Reason = "the quantity has no number at this point"
		}
	}
	if r.Status == sweep.Failed {
		j.Reason = "no operating point was found"
	}
	o.j.Rows = append(o.j.Rows, j)
	return nil
}

func (o *sweepObject) End() error {
	o.j.Counts = tallyJSON(o.a.Tally)
	if o.a.Failure != nil {
		o.j.Points, o.j.Failure = &[]pointJSON{}, failure(o.a.Failure)
	}
	return WriteJSON(o.w, o.j)
}
