package render

import (
	"math"

	"biaswright/netlist"
	"biaswright/netlist/diag"
	"biaswright/sweep/hand"
)

// HandSchema names the JSON form of handcheck.
const HandSchema = "biaswright.handcheck/1"

type handJSON struct {
	Schema   string         `json:"schema"`
	File     string         `json:"file"`
	Title    string         `json:"title"`
	Set      *list[string]  `json:"set,omitempty"`
	Points   *[]pointJSON   `json:"points,omitempty"` // empty, with a failure
	Failure  *failureJSON   `json:"failure,omitempty"`
	Assumed  *[]assumedJSON `json:"assumed,omitempty"`
	Checks   *[]handRowJSON `json:"quantities,omitempty"`
	Unsplit  *string        `json:"unsplit,omitempty"`
	Rules    *[]ruleJSON    `json:"rules,omitempty"`
	Suspects *[]suspectJSON `json:"suspects,omitempty"`
	Warnings diag.List      `json:"warnings"`
}

type assumedJSON struct {
	Of    string     `json:"of"`
	Says  string     `json:"says"`
	Items []itemJSON `json:"items"`
}

type itemJSON struct {
	Of       string      `json:"of"`
	Assumed  num         `json:"assumed"`
	Infinite bool        `json:"infinite"`
	Found    []foundJSON `json:"found"`
}

type foundJSON struct {
	Element *string `json:"element"`
	Value   num     `json:"value"`
}

type handRowJSON struct {
	Quantity   string          `json:"quantity"`
	Unit       string          `json:"unit"`
	Hand       num             `json:"hand"`
	Idealised  num             `json:"idealised"`
	Full       num             `json:"full"`
	Measured   num             `json:"measured"`
	Difference num             `json:"difference"`
	Relative   num             `json:"relative"`
	OffFull    num             `json:"measured_relative"`
	LeftOut    num             `json:"formula"`
	Shares     []handShareJSON `json:"shares"`
	Target     *handBandJSON   `json:"target"`
	Agreement  *string         `json:"agreement"`
}

type handShareJSON struct {
	Of       string `json:"of"`
	Amount   num    `json:"amount"`
	Relative num    `json:"relative"`
}

type handBandJSON struct {
	Low     num   `json:"low"`
	High    num   `json:"high"`
	Met     bool  `json:"met"`
	HandMet *bool `json:"hand_met"`
}

type ruleJSON struct {
	Rule    string    `json:"rule"`
	Element string    `json:"element"`
	Node    *string   `json:"node"`
	Bases   []string  `json:"bases"`
	Figure  num       `json:"figure"`
	Wanted  num       `json:"wanted"`
	Kept    bool      `json:"kept"`
	Costs   list[num] `json:"costs"`
	Says    string    `json:"says"`
}

type suspectJSON struct {
	Name      string `json:"name"`
	Unit      string `json:"unit"`
	From      num    `json:"from"`
	To        num    `json:"to"`
	Explained num    `json:"explained"`
	Low       num    `json:"low"`
	High      num    `json:"high"`
	Inside    *bool  `json:"inside"`
	Says      string `json:"says"`
}

// HandJSON is the answer for scripts.
func HandJSON(a *HandAnswer) any {
	j := &handJSON{
		Schema: HandSchema, File: a.File, Title: a.Circuit.Title, Set: settings(a.Set),
		Warnings: append(diag.List{}, a.Warnings...),
	}
	if a.Failure != nil {
		j.Points, j.Failure = &[]pointJSON{}, failure(a.Failure)
		return j
	}
	found := a.Hand
	j.Assumed, j.Checks, j.Rules = &[]assumedJSON{}, &[]handRowJSON{}, &[]ruleJSON{}
	for i := range found.Players {
		*j.Assumed = append(*j.Assumed, assumed(found, &found.Players[i]))
	}
	for i := range found.Rows {
		*j.Checks = append(*j.Checks, handRow(found, &found.Rows[i]))
	}
	if found.Unsplit != nil {
		says := UnsplitText(found)
		j.Unsplit = &says
	}
	for i := range found.Rules {
		*j.Rules = append(*j.Rules, rule(found, &found.Rules[i]))
	}
	j.Suspects = &[]suspectJSON{}
	for i := range found.Suspects {
		*j.Suspects = append(*j.Suspects, suspect(found, &found.Suspects[i]))
	}
	return j
}

func suspect(a *hand.Answer, s *hand.Suspect) suspectJSON {
	slot := &a.Circuit.Slots[s.Slot]
	j := suspectJSON{
		Name: s.Name, Unit: slot.Unit.String(), From: num(s.From), To: num(s.To), Explained: num(s.Explained),
		Low: num(math.NaN()), High: num(math.NaN()), Says: SuspectText(a, s),
	}
	if bounded, inside := s.Stated(a.Circuit); bounded {
		j.Low, j.High, j.Inside = num(slot.Bounds.Low), num(slot.Bounds.High), &inside
	}
	return j
}

func assumed(a *hand.Answer, p *hand.Player) assumedJSON {
	j := assumedJSON{Of: p.Text, Says: PlayerText(a, p)}
	for _, item := range p.Items {
		value := a.Circuit.Assumed[item].Value
		it := itemJSON{Of: hand.AssumedName(a.Circuit, item), Assumed: num(value), Infinite: math.IsInf(value, 1), Found: []foundJSON{}}
		for _, f := range p.Findings {
			if f.Item != item {
				continue
			}
			figure := foundJSON{Value: num(f.Real)}
			if f.Element != netlist.None {
				figure.Element = &a.Circuit.Elements[f.Element].Name
			}
			it.Found = append(it.Found, figure)
		}
		j.Items = append(j.Items, it)
	}
	return j
}

func handRow(a *hand.Answer, r *hand.Row) handRowJSON {
	j := handRowJSON{
		Quantity: r.Q.Text, Unit: r.Q.Unit.String(), Hand: num(r.Hand), Idealised: num(r.Ideal), Full: num(r.Full), Measured: num(r.Measured),
		Difference: num(r.Full - r.Hand), Relative: num((r.Full - r.Hand) / math.Abs(r.Hand)), OffFull: num((r.Measured - r.Full) / math.Abs(r.Full)),
		LeftOut: num(r.LeftOut()), Shares: []handShareJSON{},
	}
	for i, s := range r.Shares {
		j.Shares = append(j.Shares, handShareJSON{a.Players[i].Text, num(s), num(s / math.Abs(r.Hand))})
	}
	if r.Agreement != "" {
		says := string(r.Agreement)
		j.Agreement = &says
	}
	if met, ok := a.InBand(r, r.Full); ok {
		v := &a.Verdicts[r.Target]
		j.Target = &handBandJSON{Low: num(v.Low), High: num(v.High), Met: met}
		if byHand, ok := a.InBand(r, r.Hand); ok {
			j.Target.HandMet = &byHand
		}
	}
	return j
}

func rule(a *hand.Answer, r *hand.Rule) ruleJSON {
	j := ruleJSON{
		Rule: string(r.Kind), Element: a.Circuit.Elements[r.Element].Name, Bases: []string{}, Figure: num(r.Figure), Wanted: num(r.Wanted), Kept: r.Kept(),
		Costs: list[num]{}, Says: RuleText(a, r),
	}
	if r.Node != netlist.None {
		j.Node = &a.Circuit.Nodes[r.Node].Name
	}
	for _, b := range r.Bases {
		j.Bases = append(j.Bases, a.Circuit.Elements[b].Name)
	}
	for i := range a.Rows {
		j.Costs.add(a.Rows[i].Q.Text, num(r.Costs[i]))
	}
	return j
}
