package render

import (
	"math"

	"biaswright/netlist/diag"
	"biaswright/sweep/limits"
)

// LimitsSchema names the JSON form of limits.
const LimitsSchema = "biaswright.limits/1"

type limitsJSON struct {
	Schema     string           `json:"schema"`
	File       string           `json:"file"`
	Title      string           `json:"title"`
	Set        *list[string]    `json:"set,omitempty"`
	Points     *[]pointJSON     `json:"points,omitempty"` // empty, with a failure
	Failure    *failureJSON     `json:"failure,omitempty"`
	Hold       *holdJSON        `json:"hold,omitempty"`
	Unstable   *bool            `json:"unstable,omitempty"`
	Limits     []limitJSON      `json:"limits,omitempty"`
	Regulation []regulationJSON `json:"regulation,omitempty"`
	Load       *loadAnswerJSON  `json:"load,omitempty"`
	Warnings   diag.List        `json:"warnings"`
}

type holdJSON struct {
	Quantity string `json:"quantity"`
	Unit     string `json:"unit"`
	Nominal  num    `json:"nominal"`
	Band     [2]num `json:"band"`
}

type limitJSON struct {
	Axis     string   `json:"axis"`
	Nominal  num      `json:"nominal"`
	Headroom num      `json:"headroom"`
	Met      bool     `json:"met"` // the hold, over the stated range
	Low      sideJSON `json:"low"`
	High     sideJSON `json:"high"`
}

type sideJSON struct {
	At         num        `json:"at"`
	Reason     string     `json:"reason"`
	Part       *string    `json:"part"`
	Says       string     `json:"says"`
	SearchedTo num        `json:"searched_to"`
	Value      num        `json:"value"`
	Relative   num        `json:"relative"`
	Left       []leftJSON `json:"left"`
}

type leftJSON struct {
	Part    string `json:"part"`
	State   string `json:"state"`
	V       num    `json:"V"`
	I       num    `json:"I"`
	Nominal num    `json:"I_nominal"`
}

type regulationJSON struct {
	Axis       string  `json:"axis"`
	Absolute   num     `json:"absolute"`
	Relative   num     `json:"relative"`
	Resistance num     `json:"resistance"`
	Through    *string `json:"through"`
	Against    *string `json:"against"`
	Share      num     `json:"share"`
}

type loadAnswerJSON struct {
	Window  [2]num       `json:"window"`
	Outputs []outputJSON `json:"outputs"`
	MaxOhms num          `json:"max_ohms"`
	Row     *string      `json:"row"`
	Counts  []countJSON  `json:"counts"`
}

type outputJSON struct {
	Node   string `json:"node"`
	Window [2]num `json:"window"`
}

type countJSON struct {
	Where string `json:"where"`
	Most  *int   `json:"most"`
}

// LimitsJSON is the answer for scripts.
func LimitsJSON(a *LimitsAnswer) any {
	j := &limitsJSON{
		Schema: LimitsSchema, File: a.File, Title: a.Circuit.Title, Set: settings(a.Set),
		Warnings: append(diag.List{}, a.Warnings...),
	}
	if a.Failure != nil {
		j.Points, j.Failure = &[]pointJSON{}, failure(a.Failure)
		return j
	}
	j.Unstable = &a.Limits.Nominal.Unstable
	h := &a.Limits.Hold
	j.Hold = &holdJSON{h.Q.Text, h.Q.Unit.String(), num(h.Nominal), [2]num{num(h.Low), num(h.High)}}
	for i := range a.Limits.Limits {
		l := &a.Limits.Limits[i]
		low, high := a.Short(l)
		j.Limits = append(j.Limits, limitJSON{
			Axis: l.Axis, Nominal: num(l.Nominal), Headroom: num(l.Headroom), Met: !low && !high,
			Low: side(a.Limits, l, l.Low), High: side(a.Limits, l, l.High),
		})
	}
	for _, r := range a.Limits.Regulation {
		j.Regulation = append(j.Regulation, regulationJSON{
			r.Axis, num(r.Absolute), num(r.Relative), num(r.Resistance), orNull(r.Through), orNull(r.Against), num(r.Share),
		})
	}
	if l := a.Limits.Load; l != nil {
		j.Load = loadAnswer(l)
	}
	return j
}

func side(a *limits.Answer, l *limits.Limit, s limits.Side) sideJSON {
	j := sideJSON{
		At: num(s.At), Reason: string(s.Reason), Says: Says(a, l, s), SearchedTo: num(s.SearchedTo),
		Value: num(math.NaN()), Relative: num(math.NaN()), Left: []leftJSON{},
	}
	if !s.Limited() {
		return j
	}
	j.Value, j.Relative = num(s.Cause.Value), num(s.Cause.Relative)
	j.Part = orNull(s.Cause.Through)
	for i, p := range s.Cause.Left {
		if i == 0 {
			j.Part = &p.Name
		}
		j.Left = append(j.Left, leftJSON{p.Name, p.State, num(p.Volts), num(p.Amps), num(p.Nominal)})
	}
	return j
}

func loadAnswer(l *limits.Load) *loadAnswerJSON {
	j := &loadAnswerJSON{
		Window: [2]num{num(l.Low), num(l.High)}, Outputs: []outputJSON{}, MaxOhms: num(l.MaxOhms),
		Row: orNull(l.Row), Counts: []countJSON{},
	}
	for _, o := range l.Outputs {
		j.Outputs = append(j.Outputs, outputJSON{o.Node, [2]num{num(o.AtLow), num(o.AtHigh)}})
	}
	for _, c := range l.Counts {
		count := countJSON{Where: c.Where}
		if c.Most >= 0 {
			count.Most = &c.Most
		}
		j.Counts = append(j.Counts, count)
	}
	return j
}

func orNull(s string) *string {
	if s == "" {
		return nil
	}
	return &s
}
