package cli

import (
	"time"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/solve"
)

// searchBudget is how long a search for every point may take unless told otherwise: what
// one waits for at a prompt, and many times what ordinary networks need.
const searchBudget = 30 * time.Second

// A searchRequest is what the options of solve ask for beside one point.
type searchRequest struct {
	every, quick, enclose bool
	budget                time.Duration
	workers               int
}

func searchOptions(c *cli.Context) (searchRequest, error) {
	q := searchRequest{
		every: c.Bool("every"), quick: c.Bool("quick"), enclose: c.Bool("enclose"),
		budget: c.Duration("budget"), workers: c.Int("workers"),
	}
	switch {
	case !q.every && (q.quick || c.IsSet("budget") || c.IsSet("workers")):
		return q, &usageError{"--quick, --budget and --workers are for the search for every point", "add --every"}
	case q.budget <= 0:
		return q, &usageError{"--budget " + c.String("budget") + ": a search takes some time", "write --budget 30s"}
	case q.workers < 1:
		return q, usagef("--workers %d: at least one must work", q.workers)
	}
	return q, nil
}

// solve finds the point, or every point, and what is asked for beside. A point that stands
// alone is tried to be proven so, where that is cheap.
func (q *searchRequest) solve(a *render.Answer, o solve.Options) error {
	var err error
	if q.every {
		a.Every, err = solve.Every(a.Circuit, solve.EveryOptions{Options: o, Budget: q.budget, Workers: q.workers, Quick: q.quick})
		if err != nil {
			return err
		}
		a.Result = &a.Every.Result
	} else {
		if a.Result, err = solve.Solve(a.Circuit, o); err != nil {
			return err
		}
		a.Proof = a.Result.Certify()
	}
	if q.enclose {
		if a.Enclosure, err = solve.Enclose(a.Result.Point); err != nil {
			a.NoEnclosure = err.Error()
		}
	}
	return nil
}
