package cli

import (
	"errors"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist/diag"
	"biaswright/sweep/hand"
)

// handcheckMeaning says what is compared, for --help.
const handcheckMeaning = "Each hand line stands beside the full solution and what is measured. The circuit is also\n" +
	"solved with what the assume lines say: its distance from the formula is what the formula left\n" +
	"out. From there to the full solution each assumption has its share: what replacing it by the\n" +
	"real model changes, averaged over all orders of replacing them. Ends with 1 where a target is\n" +
	"not met in full."

func (r *runner) handcheckCommand() *cli.Command {
	return &cli.Command{
		Name:        "handcheck",
		Usage:       "hold each file's hand calculation against the full solution, and say where they part",
		UsageText:   "biaswright handcheck [options] FILE...",
		Description: handcheckMeaning,
		Flags: []cli.Flag{
			setFlag(),
			&cli.StringSliceFlag{Name: "near", Usage: "`NODE=VOLTS`: take the operating point nearest to these voltages; may be repeated"},
			chartFlag("the steps from the hand calculation to the full solution"),
			jsonFlag(),
			plainFlag(),
		},
		Action: r.handcheck,
	}
}

func (r *runner) handcheck(c *cli.Context) error {
	r.plain = c.Bool("plain")
	q, err := r.request(c)
	if err != nil {
		return err
	}
	return perFile(r, c, q.chart, func(name string) (*render.HandAnswer, *trouble) { return r.handchecked(name, q) }, form[*render.HandAnswer]{
		json: render.HandJSON, screen: render.HandScreen, warnings: func(a *render.HandAnswer) diag.List { return a.Warnings },
	})
}

// handchecked answers for one file and notes the exit code it earns.
func (r *runner) handchecked(name string, q *request) (*render.HandAnswer, *trouble) {
	in, unread := r.open(name, q, closed)
	if unread != nil {
		return nil, unread
	}
	c := in.actual
	refuse := func(found diag.List) (*render.HandAnswer, *trouble) { return nil, r.refuse(in.name, found) }
	a := &render.HandAnswer{File: in.name, Circuit: c, Set: q.set, Warnings: in.warnings}
	var err error
	a.Hand, err = hand.Check(c, hand.Options{Near: in.near})
	var mend *hand.Error
	switch {
	case errors.As(err, &mend):
		return refuse(diag.List{{Code: mend.Code, Span: mend.Span, Message: mend.Message, Hint: mend.Hint}})
	case err != nil:
		r.raise(exitNoPoint)
		a.Failure = failure(err)
		return a, nil
	}
	r.illustrateHand(q, a)
	for i := range a.Hand.Verdicts {
		if !a.Hand.Verdicts[i].Met {
			r.raise(exitNotMet)
		}
	}
	return a, nil
}
