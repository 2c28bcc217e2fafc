package render

import (
	"encoding/csv"
	"errors"
	"io"
	"math"
	"strconv"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/netlist/quantity"
	"biaswright/solve"
	"biaswright/sweep/compare"
)

// CompareSchema names the JSON form of compare.
const CompareSchema = "biaswright.compare/1"

type compareJSON struct {
	Schema     string         `json:"schema"`
	Set        *list[string]  `json:"set,omitempty"`
	Target     *holdJSON      `json:"target,omitempty"`
	Topologies []topologyJSON `json:"topologies"`
	Warnings   diag.List      `json:"warnings"`
}

type topologyJSON struct {
	File    string           `json:"file"`
	Title   string           `json:"title"`
	Points  *[]pointJSON     `json:"points,omitempty"` // empty, with a failure
	Failure *failureJSON     `json:"failure,omitempty"`
	Figures []comparedJSON   `json:"figures,omitempty"`
	Limits  []limitJSON      `json:"limits,omitempty"`
	Says    string           `json:"says"`
	Regul   []regulationJSON `json:"regulation,omitempty"`
}

// A comparedJSON is one figure in SI units, shares and changes as fractions of one: a
// number, or the two ends of a span.
type comparedJSON struct {
	Figure string  `json:"figure"`
	Axis   string  `json:"axis,omitempty"`
	Unit   string  `json:"unit"`
	Value  *num    `json:"value,omitempty"`
	Span   *[2]num `json:"span,omitempty"`
	Part   string  `json:"part,omitempty"`
	Best   bool    `json:"best"`
	Reason string  `json:"reason,omitempty"` // why a number is null
}

// spans tells the figures that are spans.
func spanned(key string) bool {
	switch key {
	case "supply", "ambient", "beta", "resistors", "load":
		return true
	}
	return false
}

// CompareJSON is the answer for scripts.
func CompareJSON(a *CompareAnswer) any {
	j := &compareJSON{Schema: CompareSchema, Set: settings(a.Set), Topologies: []topologyJSON{}, Warnings: append(diag.List{}, a.Warnings...)}
	rows := compare.Table(a.Topologies)
	for i, t := range a.Topologies {
		if t.Target != nil && j.Target == nil {
			j.Target = targetJSON(t.Target)
		}
		j.Topologies = append(j.Topologies, topology(a, t, i, rows))
	}
	return j
}

func targetJSON(t *netlist.Target) *holdJSON {
	low, high := t.Band()
	return &holdJSON{t.Q.Text, t.Q.Unit.String(), num(t.Value), [2]num{num(low), num(high)}}
}

func topology(a *CompareAnswer, t *compare.Topology, i int, rows []compare.Row) topologyJSON {
	j := topologyJSON{File: a.Files[i], Title: t.Circuit.Title, Says: a.Says(i, rows)}
	if t.Failure != nil {
		f := &solve.Failure{Says: t.Failure.Error()}
		errors.As(t.Failure, &f)
		j.Points, j.Failure = &[]pointJSON{}, failure(f)
		return j
	}
	for k := range rows {
		r := &rows[k]
		f := comparedJSON{Figure: r.Key, Axis: r.Axis, Unit: rowUnit(r), Best: r.Best[i]}
		low, high := num(r.Low[i]), num(r.High[i])
		if spanned(r.Key) {
			f.Span = &[2]num{low, high}
		} else {
			f.Value = &low
		}
		if r.Key == "hottest" {
			f.Part = t.Hottest
		}
		if math.IsNaN(r.Low[i]) {
			f.Reason = missing(r.Key)
		}
		j.Figures = append(j.Figures, f)
	}
	l := LimitsJSON(&LimitsAnswer{File: a.Files[i], Circuit: t.Circuit, Limits: t.Limits}).(*limitsJSON)
	j.Limits, j.Regul = l.Limits, l.Regulation
	return j
}

// missing says why a figure is not there.
func missing(key string) string {
	switch key {
	case "supply", "ambient", "beta", "resistors":
		return "the file states no range"
	case "points":
		return "not proven in the time given"
	case "dropout":
		return "it holds as far as was searched"
	}
	return "there is no such axis here"
}

// rowUnit is a row's unit as JSON and CSV have it.
func rowUnit(r *compare.Row) string {
	switch {
	case r.Key == "line":
		return "1/V"
	case r.Unit == quantity.PerKelvin:
		return "1/K"
	}
	return r.Unit.String()
}

// CompareCSV prints a row a file.
func CompareCSV(w io.Writer, a *CompareAnswer) error {
	rows := compare.Table(a.Topologies)
	out := csv.NewWriter(w)
	head := []string{"file", "title"}
	for k := range rows {
		r := &rows[k]
		name := r.Key
		if r.Axis != "" {
			name += " " + r.Axis
		}
		unit := ""
		if u := rowUnit(r); u != "" {
			unit = " [" + u + "]"
		}
		if spanned(r.Key) {
			head = append(head, name+" low"+unit, name+" high"+unit)
		} else {
			head = append(head, name+unit)
		}
	}
	lines := [][]string{append(head, "hottest part", "status")}
	for i, t := range a.Topologies {
		line := []string{a.Files[i], t.Circuit.Title}
		for k := range rows {
			line = append(line, strconv.FormatFloat(rows[k].Low[i], 'g', -1, 64))
			if spanned(rows[k].Key) {
				line = append(line, strconv.FormatFloat(rows[k].High[i], 'g', -1, 64))
			}
		}
		status := "ok"
		if t.Failure != nil {
			status = "failed"
		}
		lines = append(lines, append(line, t.Hottest, status))
	}
	return out.WriteAll(lines)
}
