package render

import (
	"bytes"
	"encoding/json"
	"math"
	"strconv"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/solve"
)

// Names of the JSON forms, each with its version; the schemas bear them too.
const (
	SolveSchema  = "biaswright.solve/1"
	ErrorsSchema = "biaswright.errors/1"
	PartsSchema  = "biaswright.parts/1"
)

// A num is a number in the shortest digits that read back to it; null where
// there is none.
type num float64

func (n num) MarshalJSON() ([]byte, error) {
	x := float64(n)
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return []byte("null"), nil
	}
	if x == 0 {
		x = 0 // -0 is no figure of a circuit
	}
	return json.Marshal(x)
}

// A list is a JSON object whose members stay in the order of the file.
type list[T any] []member[T]

type member[T any] struct {
	name  string
	value T
}

func (l *list[T]) add(name string, v T) { *l = append(*l, member[T]{name, v}) }

func (l list[T]) MarshalJSON() ([]byte, error) {
	var b bytes.Buffer
	b.WriteByte('{')
	for i, m := range l {
		if i > 0 {
			b.WriteByte(',')
		}
		name, err := marshal(m.name)
		if err != nil {
			return nil, err
		}
		value, err := marshal(m.value)
		if err != nil {
			return nil, err
		}
		b.Write(name)
		b.WriteByte(':')
		b.Write(value)
	}
	b.WriteByte('}')
	return b.Bytes(), nil
}

// marshal is json.Marshal that leaves <, > and & as they are.
func marshal(v any) ([]byte, error) {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	err := e.Encode(v)
	return bytes.TrimSuffix(b.Bytes(), []byte("\n")), err
}

type solveJSON struct {
	Schema       string        `json:"schema"`
	File         string        `json:"file"`
	Title        string        `json:"title"`
	Set          *list[string] `json:"set,omitempty"`
	At           *list[string] `json:"at,omitempty"`
	Ambient      num           `json:"ambient"`
	Points       []pointJSON   `json:"points"`
	Failure      *failureJSON  `json:"failure,omitempty"`
	Others       []pointJSON   `json:"others,omitempty"`
	Nominal      *pointJSON    `json:"nominal,omitempty"`
	Search       *searchJSON   `json:"search,omitempty"`
	Enclosure    *encloseJSON  `json:"enclosure,omitempty"`
	Requirements []verdictJSON `json:"requirements"`
	Cautions     []cautionJSON `json:"cautions"`
	Warnings     diag.List     `json:"warnings"`
}

type pointJSON struct {
	Rails    list[railJSON]  `json:"rails"`
	Nodes    list[nodeJSON]  `json:"nodes"`
	Inner    *list[nodeJSON] `json:"inner,omitempty"`
	Elements list[any]       `json:"elements"`
	Load     *loadJSON       `json:"load,omitempty"`
	Unstable bool            `json:"unstable"`
	Evidence evidenceJSON    `json:"evidence"`
}

type railJSON struct {
	V num `json:"V"`
	I num `json:"I"`
	P num `json:"P"`
}

type nodeJSON struct {
	V num `json:"V"`
}

type loadJSON struct {
	V num `json:"V"`
	I num `json:"I"`
}

type twoPinJSON struct {
	V num `json:"V"`
	I num `json:"I"`
	P num `json:"P"`
}

type junctionJSON struct {
	V  num `json:"V"`
	I  num `json:"I"`
	P  num `json:"P"`
	Tj num `json:"Tj"`
}

type npnJSON struct {
	Ic    num    `json:"Ic"`
	Ib    num    `json:"Ib"`
	Ie    num    `json:"Ie"`
	Vbe   num    `json:"Vbe"`
	Vce   num    `json:"Vce"`
	P     num    `json:"P"`
	Tj    num    `json:"Tj"`
	State string `json:"state"`
}

type pnpJSON struct {
	Ic    num    `json:"Ic"`
	Ib    num    `json:"Ib"`
	Ie    num    `json:"Ie"`
	Veb   num    `json:"Veb"`
	Vec   num    `json:"Vec"`
	P     num    `json:"P"`
	Tj    num    `json:"Tj"`
	State string `json:"state"`
}

type evidenceJSON struct {
	Residual    num    `json:"residual"`
	Where       string `json:"where"`
	LastStep    num    `json:"last_step"`
	Steps       int    `json:"steps"`
	Way         string `json:"way"`
	Determinant int    `json:"determinant"`
	Attempts    int    `json:"attempts"`
	Fallbacks   int    `json:"fallbacks"`
}

type failureJSON struct {
	Says  string        `json:"says"`
	Worst string        `json:"worst"`
	By    num           `json:"by"`
	Tried []attemptJSON `json:"tried"`
}

type attemptJSON struct {
	Way   string `json:"way"`
	Steps int    `json:"steps"`
	Ended string `json:"ended"`
}

type verdictJSON struct {
	Kind     string `json:"kind"`
	Text     string `json:"text"`
	Quantity string `json:"quantity"`
	Unit     string `json:"unit"`
	Met      bool   `json:"met"`
	Value    num    `json:"value"`
	Low      num    `json:"low"`
	High     num    `json:"high"`
	Margin   num    `json:"margin"`
	// Reason says why a number is null.
	Reason string `json:"reason,omitempty"`
}

type cautionJSON struct {
	Kind    string `json:"kind"`
	Subject string `json:"subject"`
	Other   string `json:"other,omitempty"`
	Rating  string `json:"rating,omitempty"`
	Value   num    `json:"value"`
	Limit   num    `json:"limit"`
	Says    string `json:"says"`
}

// JSON gives an answer in the form of SolveSchema, for WriteJSON.
func JSON(a *Answer) any {
	j := &solveJSON{
		Schema:       SolveSchema,
		File:         a.File,
		Title:        a.Circuit.Title,
		Set:          settings(a.Set),
		At:           settings(a.At),
		Ambient:      num(a.Circuit.Slots[a.Circuit.Ambient].Value),
		Points:       []pointJSON{},
		Requirements: []verdictJSON{},
		Cautions:     []cautionJSON{},
		Warnings:     append(diag.List{}, a.Warnings...),
	}
	if a.Failure != nil {
		j.Failure = failure(a.Failure)
		return j
	}
	j.Points = append(j.Points, point(a.Result.Point, a.Inner))
	for _, o := range a.Result.Others {
		if a.Every != nil {
			j.Points = append(j.Points, point(o, a.Inner))
		} else {
			j.Others = append(j.Others, point(o, a.Inner))
		}
	}
	switch {
	case a.Every != nil:
		j.Search = search(&a.Every.Search)
		if a.Every.Reached >= 0 {
			j.Search.Reached = &a.Every.Reached
		}
	case a.Proof != nil:
		j.Search = search(a.Proof)
	}
	if a.Enclosure != nil {
		j.Enclosure = enclosure(a)
	}
	if a.Nominal != nil {
		p := point(a.Nominal, a.Inner)
		j.Nominal = &p
	}
	for i := range a.Verdicts {
		j.Requirements = append(j.Requirements, verdict(a.Circuit, &a.Verdicts[i]))
	}
	for i := range a.Cautions {
		j.Cautions = append(j.Cautions, caution(&a.Cautions[i]))
	}
	return j
}

func settings(set []netlist.Setting) *list[string] {
	if len(set) == 0 {
		return nil
	}
	l := &list[string]{}
	for _, s := range set {
		l.add(s.Name, s.Value)
	}
	return l
}

func point(p *solve.Point, inner bool) pointJSON {
	c := p.Circuit
	j := pointJSON{Rails: list[railJSON]{}, Unstable: p.Unstable, Evidence: evidence(&p.Evidence)}
	for i, r := range p.Rails {
		j.Rails.add(c.Rails[i].Name, railJSON{num(r.V), num(r.I), num(r.P)})
	}
	for n := range c.Nodes {
		if netlist.NodeID(n) != netlist.Gnd {
			j.Nodes.add(c.Nodes[n].Name, nodeJSON{num(p.NodeV[n])})
		}
	}
	if inner {
		j.Inner = &list[nodeJSON]{}
		for _, n := range p.Inner {
			j.Inner.add(n.Name, nodeJSON{num(n.V)})
		}
	}
	for i := range c.Elements {
		elements(&j.Elements, c, i, &p.Elements[i])
	}
	if len(c.Load) > 0 {
		j.Load = &loadJSON{num(p.LoadV), num(p.LoadI)}
	}
	return j
}

// elements adds an element and the members of its row.
func elements(l *list[any], c *netlist.Circuit, i int, q *solve.ElementPoint) {
	e := &c.Elements[i]
	switch {
	case e.Kind == netlist.TransistorPart && c.Parts[e.Part].Kind.PNP:
		l.add(e.Name, pnpJSON{num(q.Ic), num(q.Ib), num(q.Ie), num(q.Vbe), num(q.Vce), num(q.P), num(q.Tj), q.State})
	case e.Kind == netlist.TransistorPart:
		l.add(e.Name, npnJSON{num(q.Ic), num(q.Ib), num(q.Ie), num(q.Vbe), num(q.Vce), num(q.P), num(q.Tj), q.State})
	case e.Kind == netlist.JunctionPart:
		l.add(e.Name, junctionJSON{num(q.V), num(q.I), num(q.P), num(q.Tj)})
	default:
		l.add(e.Name, twoPinJSON{num(q.V), num(q.I), num(q.P)})
	}
	for k, m := range q.Members {
		name := e.Name + "." + strconv.Itoa(k+1)
		if e.Kind == netlist.JunctionPart {
			l.add(name, junctionJSON{num(m.V), num(m.I), num(m.P), num(m.Tj)})
			continue
		}
		l.add(name, twoPinJSON{num(m.V), num(m.I), num(m.P)})
	}
}

func evidence(e *solve.Evidence) evidenceJSON {
	return evidenceJSON{num(e.Residual), e.Where, num(e.LastStep), e.Steps, e.Way, e.Determinant, e.Attempts, e.Fallbacks}
}

func failure(f *solve.Failure) *failureJSON {
	j := &failureJSON{Says: f.Says, Worst: f.Worst, By: num(f.By), Tried: []attemptJSON{}}
	for _, t := range f.Tried {
		j.Tried = append(j.Tried, attemptJSON{t.Way, t.Steps, t.Ended})
	}
	return j
}

func verdict(c *netlist.Circuit, v *solve.Verdict) verdictJSON {
	j := verdictJSON{
		Kind: v.Kind, Text: RequirementText(c, v), Quantity: v.Q.Text, Unit: v.Q.Unit.String(), Met: v.Met,
		Value: num(v.Value), Low: num(v.Low), High: num(v.High), Margin: num(v.Margin),
	}
	switch {
	case math.IsNaN(v.Value):
		j.Reason = "the quantity has no number at this point"
	case math.IsInf(v.Low, -1) && math.IsInf(v.High, 1):
		j.Reason = "nothing bounds the quantity"
	case math.IsInf(v.Low, -1):
		j.Reason = "there is no lower bound"
	case math.IsInf(v.High, 1):
		j.Reason = "there is no upper bound"
	}
	return j
}

func caution(c *solve.Caution) cautionJSON {
	return cautionJSON{c.Kind, c.Subject, c.Other, c.Rating, num(c.Value), num(c.Limit), CautionText(c)}
}

// ErrorsJSON is what a command prints under --json where there is no answer.
type ErrorsJSON struct {
	Schema   string    `json:"schema"`
	File     string    `json:"file"`
	Errors   diag.List `json:"errors"`
	Warnings diag.List `json:"warnings"`
}

// Errors gives diagnostics in the form of ErrorsSchema.
func Errors(file string, ds diag.List) *ErrorsJSON {
	j := &ErrorsJSON{ErrorsSchema, file, diag.List{}, diag.List{}}
	for _, d := range ds {
		if d.Severity == diag.Error {
			j.Errors = append(j.Errors, d)
		} else {
			j.Warnings = append(j.Warnings, d)
		}
	}
	return j
}

// Problem is an error that is about no place in a text, in the form of
// ErrorsSchema: line and column are 0.
func Problem(file, code, message, hint string) *ErrorsJSON {
	return Errors(file, diag.List{{Code: code, Message: message, Hint: hint, Span: diag.Span{File: file}}})
}
