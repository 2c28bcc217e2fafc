package render

import (
	"biaswright/netlist/diag"
	"biaswright/sweep/choose"
)

// ChooseSchema names the JSON form of choose.
const ChooseSchema = "biaswright.choose/1"

type chooseJSON struct {
	Schema   string        `json:"schema"`
	File     string        `json:"file"`
	Title    string        `json:"title"`
	Set      *list[string] `json:"set,omitempty"`
	Points   *[]pointJSON  `json:"points,omitempty"` // empty, with a failure
	Failure  *failureJSON  `json:"failure,omitempty"`
	Open     []openJSON    `json:"open,omitempty"`
	Fit      choose.Fit    `json:"fit,omitempty"`
	Exact    *choiceJSON   `json:"exact,omitempty"`
	Reached  *bool         `json:"reached,omitempty"`
	Says     *[]string     `json:"says,omitempty"` // how near the targets come, out of reach
	Search   *searchedJSON `json:"search,omitempty"`
	Ideal    *choiceJSON   `json:"ideal,omitempty"` // where pairs were tried
	Choices  *[]choiceJSON `json:"choices,omitempty"`
	Written  *string       `json:"written,omitempty"`
	Warnings diag.List     `json:"warnings"`
}

type openJSON struct {
	Element string `json:"element"`
	Series  string `json:"series"`
	Exact   num    `json:"exact"`
}

type searchedJSON struct {
	Combinations int             `json:"combinations"`
	Whole        bool            `json:"whole"`
	Values       []gridRangeJSON `json:"values"`
}

type gridRangeJSON struct {
	Element string `json:"element"`
	Low     num    `json:"low"`
	High    num    `json:"high"`
	Count   int    `json:"count"`
}

type choiceJSON struct {
	Values       []chosenJSON      `json:"values"`
	Met          bool              `json:"met"`
	Unmet        int               `json:"unmet"`
	MissedBy     num               `json:"missed_by"`
	Nominal      num               `json:"nominal"`
	Worst        num               `json:"worst"`
	Drawn        num               `json:"drawn"`
	Rails        list[railJSON]    `json:"rails"`
	Requirements []requirementJSON `json:"requirements"`
	Ratings      []ratingJSON      `json:"ratings"`
	NoPoint      *list[num]        `json:"no_point"`
}

type chosenJSON struct {
	Element   string         `json:"element"`
	Ohms      num            `json:"ohms"`
	Join      *string        `json:"join"` // null for one resistor
	Resistors []resistorJSON `json:"resistors"`
}

type resistorJSON struct {
	Ohms num      `json:"ohms"`
	In   []string `json:"in"`
}

type requirementJSON struct {
	Kind     string    `json:"kind"`
	Text     string    `json:"text"`
	Quantity string    `json:"quantity"`
	Unit     string    `json:"unit"`
	Met      bool      `json:"met"`
	Low      num       `json:"low"`
	High     num       `json:"high"`
	Nominal  num       `json:"nominal"`
	Worst    num       `json:"worst"`
	Margin   num       `json:"margin"`
	At       list[num] `json:"at"`
}

type ratingJSON struct {
	Element string    `json:"element"`
	Rating  string    `json:"rating"`
	Value   num       `json:"value"`
	Limit   num       `json:"limit"`
	At      list[num] `json:"at"`
}

// ChooseJSON is the answer for scripts.
func ChooseJSON(a *ChooseAnswer) any {
	j := &chooseJSON{
		Schema: ChooseSchema, File: a.File, Title: a.Circuit.Title, Set: settings(a.Set),
		Written: orNull(a.Written), Warnings: append(diag.List{}, a.Warnings...),
	}
	if a.Failure != nil {
		j.Points, j.Failure = &[]pointJSON{}, failure(a.Failure)
		return j
	}
	found := a.Found
	for i := range found.Unknowns {
		u := &found.Unknowns[i]
		j.Open = append(j.Open, openJSON{u.Name, u.Series, num(u.Exact)})
	}
	exact := choice(found, &found.Exact)
	j.Fit, j.Exact, j.Reached, j.Choices = found.Fit, &exact, &found.Reached, &[]choiceJSON{}
	if !found.Reached {
		j.Says = &[]string{}
		for i := range found.Exact.Requirements {
			if says := ReachText(found, i); says != "" {
				*j.Says = append(*j.Says, says)
			}
		}
		return j
	}
	j.Search = &searchedJSON{Combinations: found.Combinations, Whole: found.Whole}
	for i := range found.Unknowns {
		u := &found.Unknowns[i]
		j.Search.Values = append(j.Search.Values, gridRangeJSON{u.Name, num(u.Low), num(u.High), u.Count})
	}
	if found.Ideal != nil {
		ideal := choice(found, found.Ideal)
		j.Ideal = &ideal
	}
	for i := range found.Choices {
		*j.Choices = append(*j.Choices, choice(found, &found.Choices[i]))
	}
	return j
}

func choice(a *choose.Answer, c *choose.Choice) choiceJSON {
	j := choiceJSON{
		Met: c.Met(), Unmet: c.Unmet, MissedBy: num(c.Miss), Nominal: num(c.NominalScore()), Worst: num(c.Score), Drawn: num(c.Draw),
		Rails: list[railJSON]{}, Requirements: []requirementJSON{}, Ratings: []ratingJSON{},
	}
	for i := range a.Unknowns {
		j.Values = append(j.Values, chosen(a.Unknowns[i].Name, c, i))
	}
	for i, r := range c.Nominal.Rails {
		j.Rails.add(a.Circuit.Rails[i].Name, railJSON{num(r.V), num(r.I), num(r.P)})
	}
	for i := range c.Requirements {
		r := &c.Requirements[i]
		v := &r.Worst
		j.Requirements = append(j.Requirements, requirementJSON{
			v.Kind, RequirementText(a.Circuit, v), v.Q.Text, v.Q.Unit.String(), v.Met, num(v.Low), num(v.High),
			num(r.Nominal.Value), num(v.Value), num(v.Margin), endsJSON(r.At),
		})
	}
	for _, r := range c.Ratings {
		j.Ratings = append(j.Ratings, ratingJSON{r.Subject, r.Rating, num(r.Value), num(r.Limit), endsJSON(r.At)})
	}
	if c.Failed != nil {
		at := endsJSON(*c.Failed)
		j.NoPoint = &at
	}
	return j
}

func chosen(name string, c *choose.Choice, i int) chosenJSON {
	one := func(ohms float64) resistorJSON {
		return resistorJSON{num(ohms), append([]string{}, choose.SeriesOf(ohms)...)}
	}
	p := c.Pair(i)
	if p == nil {
		return chosenJSON{Element: name, Ohms: num(c.Ohms[i]), Resistors: []resistorJSON{one(c.Ohms[i])}}
	}
	join := "series"
	if p.Parallel {
		join = "parallel"
	}
	return chosenJSON{name, num(c.Ohms[i]), &join, []resistorJSON{one(p.A), one(p.B)}}
}

func endsJSON(ends []choose.End) list[num] {
	out := list[num]{}
	for _, e := range ends {
		out.add(e.Name, num(e.Value))
	}
	return out
}
