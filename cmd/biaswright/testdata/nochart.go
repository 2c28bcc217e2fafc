// A program without charts, for the benchmark that measures how large they are.

package cli

import (
	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/render"
	"biaswright/sweep"
)

func chartFlag(string) cli.Flag { return &cli.StringFlag{Name: "chart"} }
func sketchFlag() cli.Flag      { return &cli.BoolFlag{Name: "sketch"} }

type chartFile struct{}

func chartOption(*cli.Context) (chartFile, error) { return chartFile{}, nil }

func (*runner) illustrate(*request, *render.Answer)                   {}
func (*runner) illustrateLimits(*limitsRequest, *render.LimitsAnswer) {}

func (*runner) illustrateChoices(*chooseRequest, *render.ChooseAnswer) {}
func (*runner) illustrateHand(*request, *render.HandAnswer)            {}
func (*runner) illustrateComparison(chartFile, *render.CompareAnswer)  {}
func (chartFile) wanted() bool                                         { return false }

type sweepDrawing struct{}

func (*runner) sweepDrawing(*sweepRequest, *render.SweepAnswer, *sweep.Plan) sweepDrawing {
	return sweepDrawing{}
}
func (sweepDrawing) add(sweep.Row) {}
func (sweepDrawing) finish()       {}
