package chart_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/clipperhouse/displaywidth"

	"biaswright/cmd/biaswright/internal/chart"
	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/sweep"
	"biaswright/sweep/choose"
	"biaswright/sweep/hand"
)

// readable fails where two texts of a figure overlap, or one leaves it.
func readable(t *testing.T, f *figure.Figure) {
	t.Helper()
	var texts []*figure.Text
	for _, s := range f.Shapes {
		if text, ok := s.(*figure.Text); ok && text.Text != "" {
			texts = append(texts, text)
		}
	}
	if len(texts) == 0 {
		t.Fatal("nothing is written")
	}
	for i, a := range texts {
		al, at, ar, ab := a.Extent()
		if al < 0 || at < 0 || ar > f.Width || ab > f.Height {
			t.Errorf("%q leaves the figure: %.1f..%.1f, %.1f..%.1f of %.1f by %.1f", a.Text, al, ar, at, ab, f.Width, f.Height)
		}
		for _, b := range texts[:i] {
			bl, bt, br, bb := b.Extent()
			// Ascenders and descenders of two lines may share a hair's breadth.
			const hair = 2
			if al < br && bl < ar && at+hair < bb && bt+hair < ab {
				t.Errorf("%q and %q overlap", a.Text, b.Text)
			}
		}
	}
}

// ladder is a circuit of paths that each drop volts in several steps, some of them tiny.
func ladder(paths int, supply, least float64) string {
	var b strings.Builder
	fmt.Fprintf(&b, "rail V = %g V (%g V .. %g V)\nambient = 25 degC (0 degC .. 70 degC)\n", supply, 0.9*supply, 1.1*supply)
	b.WriteString("part gp npn Vbe = 0.65 V at 1 mA, betaF = 150\npart gpp pnp Veb = 0.65 V at 1 mA, betaF = 150\n")
	for i := range paths {
		switch i % 4 {
		case 0: // small drops one on top of the other
			fmt.Fprintf(&b, "path V -> RA%d 10k -> up%d -> DA%d drop %g mV -> DB%d drop %g mV -> low%d -> RB%d 10 -> gnd\n", i, i, i, least*1e3, i, least*1e3, i, i)
		case 1: // a follower and its base's divider
			fmt.Fprintf(&b, "path V -> RC%d 2k -> b%d -> RD%d 1k -> gnd\n", i, i, i)
			fmt.Fprintf(&b, "path V -> Q%d gp base=b%d -> e%d -> RE%d 1k -> gnd\n", i, i, i, i)
		case 2: // upside down
			fmt.Fprintf(&b, "path V -> RF%d 1k -> h%d -> P%d gpp base=j%d -> gnd\npath V -> RG%d 10k -> j%d -> RH%d 10k -> gnd\n", i, i, i, i, i, i, i)
		default: // a rise
			fmt.Fprintf(&b, "path V -> RJ%d 1k -> k%d -> CELL%d cell 1.5 V -> m%d -> RK%d 2k -> gnd\n", i, i, i, i, i)
		}
	}
	return b.String()
}

// TestHeadroomReadable draws 1 to 12 lots of paths, with drops from 20 mV to 200 V.
func TestHeadroomReadable(t *testing.T) {
	for paths := 1; paths <= 12; paths++ {
		for _, supply := range []float64{3, 12, 200} {
			t.Run(fmt.Sprintf("%d paths at %g V", paths, supply), func(t *testing.T) {
				readable(t, chart.Headroom(solved(t, circuit(t, ladder(paths, supply, 0.02)))))
			})
		}
	}
}

func TestDemosReadable(t *testing.T) {
	for _, name := range []string{"mast-lamp", "pressure-source", "sensor-bank"} {
		t.Run(name, func(t *testing.T) {
			c := demo(t, name)
			readable(t, chart.Headroom(solved(t, c)))
			f, err := chart.Limits(limitsOf(t, c))
			if err != nil {
				t.Fatal(err)
			}
			readable(t, f)
			checked, err := hand.Check(c, hand.Options{})
			if err != nil {
				t.Fatal(err)
			}
			steps, err := chart.Hand(&render.HandAnswer{File: "test.bias", Circuit: c, Hand: checked})
			if err != nil {
				t.Fatal(err)
			}
			readable(t, steps)
		})
	}
}

// choices is the short list of a text's open values.
func choices(t *testing.T, text string) *render.ChooseAnswer {
	t.Helper()
	c := circuit(t, text)
	found, err := choose.Find(c, choose.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return &render.ChooseAnswer{File: "test.bias", Circuit: c, Found: found}
}

// TestChoices draws a short list: a dot for each nominal value, at its place on the axis,
// a bar to the worst one, and a verdict in words; values and names of any length.
func TestChoices(t *testing.T) {
	const text = "rail V = 10 V (9 V .. 11 V)\npath V -> RA 1k 1%% -> m -> %s ? E12 5%% -> gnd\ntarget m.V = 5 V within 12%%\nkeep m.V > 4 V\nkeep RA.P < 30 mW + 0.001 * V.P\n"
	for _, name := range []string{"RB", "R" + strings.Repeat("x", 60)} {
		a := choices(t, fmt.Sprintf(text, name))
		f, err := chart.Choose(a)
		if err != nil {
			t.Fatal(err)
		}
		readable(t, f)
		lines := len(a.Found.Choices) + 1 // the exact values too
		const panels = 3                  // a target and two keeps
		dots, alarms, verdicts := 0, 0, 0
		for _, s := range f.Shapes {
			switch s := s.(type) {
			case *figure.Dot:
				dots++
			case *figure.Line:
				if s.Paint == figure.Alarm {
					alarms++
				}
			case *figure.Text:
				if strings.HasSuffix(s.Text, "  NOT MET") {
					verdicts++
				}
			}
		}
		missed := 0
		for _, c := range append([]choose.Choice{a.Found.Exact}, a.Found.Choices...) {
			for _, r := range c.Requirements {
				if !r.Worst.Met {
					missed++
				}
			}
		}
		if missed == 0 || dots != panels*lines || verdicts != missed || alarms != 2*missed { // a bar and its end
			t.Errorf("%s: %d dots, %d verdicts, %d alarms; want %d, %d, %d", name, dots, verdicts, alarms, panels*lines, missed, 2*missed)
		}
	}
}

// TestChoicesToScale reads the dots back: the divider's voltages in the order and at the
// distances of Ohm's law.
func TestChoicesToScale(t *testing.T) {
	a := choices(t, "rail V = 10 V\npath V -> RA 1k -> m -> RB ? E6 -> gnd\ntarget m.V = 5 V within 40%\n")
	f, err := chart.Choose(a)
	if err != nil {
		t.Fatal(err)
	}
	var xs, want []float64
	for _, s := range f.Shapes {
		if d, ok := s.(*figure.Dot); ok {
			xs = append(xs, d.At.X)
		}
	}
	want = append(want, 5)
	for _, c := range a.Found.Choices {
		want = append(want, 10*c.Ohms[0]/(1000+c.Ohms[0]))
	}
	if len(xs) != len(want) || len(want) < 4 {
		t.Fatalf("%d dots, want %d", len(xs), len(want))
	}
	for i := 3; i < len(xs); i++ {
		if got, w := (xs[i]-xs[1])/(xs[2]-xs[1]), (want[i]-want[1])/(want[2]-want[1]); math.Abs(got-w) > 1e-6 {
			t.Errorf("dot %d lies at %g of the way from the first choice to the second, want %g", i, got, w)
		}
	}
}

// TestBlocksToScale reads the blocks back: each takes its element's share of the height.
func TestBlocksToScale(t *testing.T) {
	a := solved(t, circuit(t, "rail V = 10 V\npath V -> R1 3k -> a -> R2 6k -> b -> R3 1k -> gnd\n"))
	var tall []float64
	for _, s := range chart.Headroom(a).Shapes {
		if area, ok := s.(*figure.Area); ok && area.Fill == figure.Ohmic {
			tall = append(tall, area.Points[2].Y-area.Points[0].Y)
		}
	}
	if len(tall) != 3 {
		t.Fatalf("%d blocks, want 3", len(tall))
	}
	all := tall[0] + tall[1] + tall[2]
	for i, share := range []float64{0.3, 0.6, 0.1} { // by Ohm's law
		if math.Abs(tall[i]/all-share) > 1e-9 {
			t.Errorf("block %d takes %g of the height, want %g", i, tall[i]/all, share)
		}
	}
}

func swept(t *testing.T, c *netlist.Circuit, log bool, show []string, over ...string) *figure.Figure {
	t.Helper()
	p := sweep.Plan{Circuit: c, Show: show, Workers: 1}
	for i, text := range over {
		axis, err := sweep.ParseAxis(c, text, 41, log && i == len(over)-1)
		if err != nil {
			t.Fatal(err)
		}
		p.Axes = append(p.Axes, axis)
	}
	res, err := solve.Solve(c, solve.Options{})
	if err != nil {
		t.Fatal(err)
	}
	p.Nominal = res.Point
	s := chart.NewSweep(answer(t, c, p.Axes, show), p.Nominal, log)
	if err := sweep.Run(t.Context(), p, func(r sweep.Row) error { s.Row(r); return nil }); err != nil {
		t.Fatal(err)
	}
	f, err := s.Figure()
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func answer(t *testing.T, c *netlist.Circuit, axes []sweep.Axis, show []string) *render.SweepAnswer {
	t.Helper()
	a := &render.SweepAnswer{File: "test.bias", Circuit: c, Axes: axes}
	for _, text := range show {
		e, list := c.ParseExpr(text)
		if list.HasErrors() {
			t.Fatal(list)
		}
		a.Show = append(a.Show, e)
	}
	return a
}

// values is a list of n values of an axis.
func values(name string, from, to float64, n int) string {
	list := make([]string, n)
	for i := range list {
		list[i] = fmt.Sprint(from + (to-from)*float64(i)/float64(max(1, n-1)))
	}
	return name + "=" + strings.Join(list, ",")
}

// TestCurvesReadable draws 1 to 14 curves, near each other and far apart, over even and
// logarithmic axes.
func TestCurvesReadable(t *testing.T) {
	c := demo(t, "mast-lamp")
	readable(t, swept(t, c, false, []string{"LAMP.I"}, "VCC=0..24"))
	for n := 2; n <= 14; n++ {
		for name, outer := range map[string]string{"near": values("RE", 46, 48, n), "far": values("RE", 4.7, 4700, n)} {
			t.Run(fmt.Sprintf("%d %s", n, name), func(t *testing.T) {
				readable(t, swept(t, c, false, []string{"LAMP.I"}, outer, "VCC=0..24"))
				readable(t, swept(t, c, true, []string{"LAMP.I", "Q1.P"}, outer, "R1=100..1M"))
			})
		}
	}
}

// TestStrokesTellCurves asserts that twelve curves differ without their colours.
func TestStrokesTellCurves(t *testing.T) {
	f := swept(t, demo(t, "mast-lamp"), false, []string{"LAMP.I"}, values("RE", 40, 51, 12), "VCC=8..14")
	looks := map[string]bool{}
	dash := ""
	for _, s := range f.Shapes {
		switch s := s.(type) {
		case *figure.Line:
			if s.Width == 2 {
				dash = fmt.Sprint(s.Dash)
			}
		case *figure.Dot:
			looks[fmt.Sprint(dash, "dot", s.Fill == figure.Paper)] = true
		case *figure.Area:
			if s.Width == 1.5 {
				looks[fmt.Sprint(dash, len(s.Points), s.Points[0].Y > s.Points[1].Y, s.Fill == figure.Paper)] = true
			}
		}
	}
	if len(looks) != 12 {
		t.Errorf("12 curves have %d looks: %v", len(looks), looks)
	}
}

// byHand draws rows that were never solved.
func byHand(t *testing.T, amps ...float64) (*figure.Figure, error) {
	t.Helper()
	c := demo(t, "mast-lamp")
	volts := make([]float64, len(amps))
	for i := range volts {
		volts[i] = float64(i + 1)
	}
	axis, err := sweep.NewAxis(c, "VCC", volts)
	if err != nil {
		t.Fatal(err)
	}
	s := chart.NewSweep(answer(t, c, []sweep.Axis{axis}, []string{"LAMP.I"}), nil, false)
	for i, v := range amps {
		r := sweep.Row{At: volts[i : i+1], Values: []float64{v}, Status: sweep.OK}
		if math.IsNaN(v) {
			r.Status = sweep.Failed
		}
		s.Row(r)
	}
	return s.Figure()
}

// TestGaps draws a sweep with a failed point: the curve has a gap there, and a note
// says so.
func TestGaps(t *testing.T) {
	f, err := byHand(t, 1e-3, 2e-3, math.NaN(), 4e-3, 5e-3)
	if err != nil {
		t.Fatal(err)
	}
	pieces := 0
	for _, shape := range f.Shapes {
		if l, ok := shape.(*figure.Line); ok && l.Paint == figure.Curve(0) {
			pieces++
			if len(l.Points) != 2 {
				t.Errorf("a piece of %d points, want 2", len(l.Points))
			}
		}
	}
	if pieces != 2 {
		t.Errorf("%d pieces, want 2", pieces)
	}
	if !strings.Contains(texts(f), "1 of 5 points") {
		t.Error("no note tells of the gap")
	}
}

// TestNothingToDraw has no numbers at all.
func TestNothingToDraw(t *testing.T) {
	if _, err := byHand(t, math.NaN(), math.NaN()); err != chart.ErrNothing {
		t.Errorf("%v, want %v", err, chart.ErrNothing)
	}
}

func texts(f *figure.Figure) string {
	var out []string
	for _, s := range f.Shapes {
		if t, ok := s.(*figure.Text); ok {
			out = append(out, t.Text)
		}
	}
	return strings.Join(out, " ")
}

// TestLimitsAreMarked counts the limits' lines, and finds each reason among the texts.
func TestLimitsAreMarked(t *testing.T) {
	a := limitsOf(t, demo(t, "mast-lamp"))
	f, err := chart.Limits(a)
	if err != nil {
		t.Fatal(err)
	}
	said := texts(f)
	marks, ends := 0, 0
	for _, s := range f.Shapes {
		if l, ok := s.(*figure.Line); ok && l.Paint == figure.Alarm && l.Width == 1.5 {
			marks++
		}
	}
	for i := range a.Limits.Limits {
		l := &a.Limits.Limits[i]
		for _, high := range []bool{false, true} {
			side := l.Low
			if high {
				side = l.High
			}
			if !math.IsNaN(side.At) {
				ends++
			}
			if says := render.SideSays(a, l, high); !strings.Contains(said, says) {
				t.Errorf("%q is not written", says)
			}
		}
	}
	if marks != ends || ends == 0 {
		t.Errorf("%d marks for %d limits", marks, ends)
	}
}

// TestSketch checks what a sketch promises: no line too long, plain in ASCII, every
// element named once, bars to scale.
func TestSketch(t *testing.T) {
	for paths := 1; paths <= 12; paths++ {
		for _, supply := range []float64{3, 200} {
			a := solved(t, circuit(t, ladder(paths, supply, 0.02)))
			for _, plain := range []bool{false, true} {
				lines := chart.Sketch(a.Result.Point, plain)
				all := strings.Join(lines, "\n") + "\n"
				for _, line := range lines {
					if w := displaywidth.String(line); w > render.Columns {
						t.Errorf("%d paths: a line of %d columns: %s", paths, w, line)
					}
				}
				if plain && strings.ContainsFunc(all, func(r rune) bool { return r > 127 }) {
					t.Errorf("plain is not ASCII:\n%s", all)
				}
				for i := range a.Circuit.Elements {
					name := a.Circuit.Elements[i].Name
					if n := strings.Count(all, "  "+name+" "); n != 1 {
						t.Errorf("%d paths at %g V: %s is named %d times\n%s", paths, supply, name, n, all)
					}
				}
			}
		}
	}
	lines := chart.Sketch(solved(t, circuit(t, "rail V = 10 V\npath V -> R1 3k -> a -> D1 drop 5 V -> b -> R3 2k -> gnd\n")).Result.Point, true)
	count := func(s string) int { return strings.Count(strings.Join(lines, "\n"), s) }
	ohmic, ideal := count("###"), count("| |")
	if ohmic == 0 || ohmic != ideal { // half of the supply each
		t.Errorf("%d lines of resistors, %d of the drop, want as many\n%s", ohmic, ideal, strings.Join(lines, "\n"))
	}
}
