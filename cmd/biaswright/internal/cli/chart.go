package cli

import (
	"bytes"
	"fmt"
	"io"
	"path/filepath"
	"slices"
	"strings"

	"github.com/urfave/cli/v2"

	"biaswright/cmd/biaswright/internal/chart"
	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/sweep"
)

func chartFlag(what string) cli.Flag {
	return &cli.StringFlag{Name: "chart", Usage: "`FILE.svg` or FILE.png: draw " + what + " into that file"}
}

func sketchFlag() cli.Flag {
	return &cli.BoolFlag{Name: "sketch", Usage: "draw where the volts go in characters", DisableDefaultText: true}
}

// A chartFile is where a chart goes, and how it is written. The zero value is none.
type chartFile struct {
	name  string
	write func(io.Writer, *figure.Figure) error
}

func (f chartFile) wanted() bool { return f.name != "" }

// chartOption reads --chart: the ending says what is written.
func chartOption(c *cli.Context) (chartFile, error) {
	if !c.IsSet("chart") {
		return chartFile{}, nil
	}
	name := c.String("chart")
	switch strings.ToLower(filepath.Ext(name)) {
	case ".svg":
		return chartFile{name, figure.WriteSVG}, nil
	case ".png":
		return chartFile{name, figure.WritePNG}, nil
	}
	return chartFile{}, &usageError{fmt.Sprintf("--chart %q: a chart ends in .svg or .png", name), "write --chart FILE.svg"}
}

// illustrate draws what the options ask for of a point.
func (r *runner) illustrate(q *request, a *render.Answer) {
	if q.chart.wanted() {
		r.draw(q.chart, chart.Headroom(a))
	}
	if q.sketch {
		a.Sketch = chart.Sketch(a.Result.Point, r.plain)
	}
}

// illustrateLimits draws what the options ask for of limits.
func (r *runner) illustrateLimits(q *limitsRequest, a *render.LimitsAnswer) {
	if q.chart.wanted() {
		fig, err := chart.Limits(a)
		r.drawIf(q.chart, fig, err)
	}
	if q.sketch {
		a.Sketch = chart.SketchLimits(a.Limits, r.plain)
	}
}

func (r *runner) illustrateHand(q *request, a *render.HandAnswer) {
	if q.chart.wanted() {
		fig, err := chart.Hand(a)
		r.drawIf(q.chart, fig, err)
	}
}

func (r *runner) illustrateChoices(q *chooseRequest, a *render.ChooseAnswer) {
	if q.chart.wanted() {
		fig, err := chart.Choose(a)
		r.drawIf(q.chart, fig, err)
	}
}

func (r *runner) illustrateComparison(f chartFile, a *render.CompareAnswer) {
	fig, err := chart.Compare(a)
	r.drawIf(f, fig, err)
}

// A sweepDrawing takes a sweep's rows as they come; without a chart it lets them pass.
type sweepDrawing struct {
	r    *runner
	file chartFile
	s    *chart.Sweep // nil without a chart
}

func (r *runner) sweepDrawing(q *sweepRequest, a *render.SweepAnswer, p *sweep.Plan) *sweepDrawing {
	if !q.chart.wanted() {
		return &sweepDrawing{}
	}
	inner := p.Axes[len(p.Axes)-1].Name
	byRatios := slices.ContainsFunc(q.log, func(typed string) bool { // VCC is VCC.V too
		typed = strings.TrimSpace(typed)
		return typed == inner || typed+".V" == inner
	})
	return &sweepDrawing{r, q.chart, chart.NewSweep(a, p.Nominal, byRatios)}
}

func (d *sweepDrawing) add(row sweep.Row) {
	if d.s != nil {
		d.s.Row(row)
	}
}

func (d *sweepDrawing) finish() {
	if d.s != nil {
		fig, err := d.s.Figure()
		d.r.drawIf(d.file, fig, err)
	}
}

// drawIf draws unless there is nothing to draw.
func (r *runner) drawIf(f chartFile, fig *figure.Figure, err error) {
	if err != nil {
		r.raise(exitNoPoint)
		r.complain("no chart: %v", err)
		return
	}
	r.draw(f, fig)
}

// draw writes a figure, whole or not at all, and notes the exit code.
func (r *runner) draw(f chartFile, fig *figure.Figure) {
	var b bytes.Buffer
	err := f.write(&b, fig)
	if err == nil {
		err = r.create(f.name, b.Bytes(), false)
	}
	if err != nil {
		r.raise(exitFile)
		r.complain("cannot write %s: %v", f.name, err)
	}
}
