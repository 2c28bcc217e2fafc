package choose_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"sort"
	"strconv"
	"strings"
	"testing"

	"biaswright/devices"
	"biaswright/devices/shelf"
	"biaswright/netlist"
	"biaswright/netlist/quantity"
	"biaswright/solve"
	"biaswright/solve/mna"
	"biaswright/solve/newton"
	"biaswright/sweep/choose"
)

func read(t testing.TB, name, text string) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read(name, []byte(text), devices.Catalogue(), netlist.Files{Shelves: shelf.All()})
	if list.HasErrors() {
		t.Fatalf("%s: %+v", name, list)
	}
	return c
}

// shipped gives the name and text of a circuit that ships.
func shipped(t testing.TB, circuit string) (name, text string) {
	t.Helper()
	name = filepath.Join("..", "..", "testdata", "circuits", circuit+".bias")
	b, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	return name, string(b)
}

// An exhaustive search tries every combination of a grid, each corner solved cold, and
// gives none up before its end: none of what package choose does to be quick.
type exhaustive struct {
	t       *testing.T
	c       *netlist.Circuit
	slots   []netlist.SlotID // of the unknowns
	grids   [][]float64
	drawn   [][]netlist.SlotID
	corners []corner
}

// A corner is the circuit at one combination of the ends of its ranges, on one system
// for its tolerances' middles and one for their ends.
type corner struct {
	c            *netlist.Circuit
	plain, moved *mna.System
}

type result struct {
	ohms  []float64
	burnt bool
	off   bool // something is missed at the nominal point
	unmet int
	miss  float64 // of targets and keeps
	lost  float64 // of the hold
	score float64
	away  float64
}

func newExhaustive(t *testing.T, c *netlist.Circuit, a *choose.Answer) *exhaustive {
	t.Helper()
	var open []netlist.Setting
	for _, u := range a.Unknowns {
		open = append(open, netlist.Setting{Name: u.Name, Value: "1k"})
	}
	c, list := c.With(open...) // from now on every unknown has a number of its own
	if list.HasErrors() {
		t.Fatal(list)
	}
	x := &exhaustive{t: t, c: c}
	for _, u := range a.Unknowns {
		id, ok := c.Lookup(u.Name)
		if !ok {
			t.Fatal(u.Name)
		}
		x.slots = append(x.slots, id)
	}
	x.drawn = drawn(c)
	x.corner(c)
	var ranged []string
	for i := range c.Rails {
		if c.Slots[c.Rails[i].Volts].Bounds.Stated {
			ranged = append(ranged, c.Rails[i].Name)
		}
	}
	if c.Slots[c.Ambient].Bounds.Stated {
		ranged = append(ranged, "ambient")
	}
	for k := 0; len(ranged) > 0 && k < 1<<len(ranged); k++ {
		var ends []netlist.Setting
		for i, name := range ranged {
			ends = append(ends, netlist.Setting{Name: name, Value: []string{"low", "high"}[k>>i&1]})
		}
		at, list := c.At(ends...)
		if list.HasErrors() {
			t.Fatal(list)
		}
		x.corner(at)
	}
	return x
}

func (x *exhaustive) corner(c *netlist.Circuit) {
	x.t.Helper()
	plain, err := mna.New(c)
	if err != nil {
		x.t.Fatal(err)
	}
	x.corners = append(x.corners, corner{c, plain, plain.Clone()})
}

// drawn lists all numbers with a tolerance, those of a batch together.
func drawn(c *netlist.Circuit) [][]netlist.SlotID {
	groups := map[string][]netlist.SlotID{}
	var order []string
	add := func(id netlist.SlotID, group string) {
		if id == netlist.None || !c.Slots[id].Bounds.Stated || math.IsNaN(c.Value(id)) {
			return
		}
		if groups[group] == nil {
			order = append(order, group)
		}
		groups[group] = append(groups[group], id)
	}
	for _, id := range c.Givens {
		add(id, "given "+c.Slots[id].Name)
	}
	for i := range c.Elements {
		e := &c.Elements[i]
		who := e.Name
		for b := range c.Batches {
			if slices.Contains(c.Batches[b], i) {
				who = fmt.Sprint("batch ", b)
			}
		}
		add(e.Value, who+" value")
		add(e.TC, who+" TC")
		add(e.Size, who+" size")
		for k, id := range e.Params {
			add(id, fmt.Sprint(who, " param ", k))
		}
	}
	var out [][]netlist.SlotID
	for _, g := range order {
		out = append(out, groups[g])
	}
	return out
}

// cold solves with these numbers from nothing; nil where there is no point that could be
// stable.
func cold(s *mna.System, values []float64) *solve.Point {
	s.Apply(values)
	x := make([]float64, s.Size())
	var w newton.Work
	if r := newton.Solve(s, x, &w, newton.Options{}); r.Outcome == newton.Converged && s.LastSign() > 0 {
		return solve.PointAt(s, x, "cold")
	}
	res, err := solve.SolveSystem(s, solve.Options{})
	if err != nil || res.Point.Unstable {
		return nil
	}
	return res.Point
}

// judge tries one combination.
func (x *exhaustive) judge(ohms []float64) result {
	r := result{ohms: slices.Clone(ohms)}
	unmet := map[[2]any]bool{}
	var nominal, holdFrom *solve.Point
	see := func(p *solve.Point) {
		if p == nil {
			r.score, r.miss, r.lost = math.Inf(1), math.Inf(1), math.Inf(1)
			for _, v := range solve.Judge(nominal, holdFrom) {
				unmet[[2]any{v.Kind, v.Index}] = true
			}
			return
		}
		for _, v := range solve.Judge(p, holdFrom) {
			if !v.Met {
				unmet[[2]any{v.Kind, v.Index}] = true
				if by := missed(x.c, &v); v.Kind == "hold" {
					r.lost = math.Max(r.lost, by)
				} else {
					r.miss = math.Max(r.miss, by)
				}
			}
			if v.Kind == "target" {
				target := &x.c.Targets[v.Index]
				width := target.Within
				if target.Relative {
					width *= math.Abs(target.Value)
				}
				r.score = math.Max(r.score, math.Abs(v.Value-target.Value)/width)
			}
		}
	}
	for i, at := range x.corners {
		values := at.c.Values()
		for k, id := range x.slots {
			values[id] = ohms[k]
		}
		at.c.Propagate(values)
		p := cold(at.plain, values)
		if i == 0 {
			if nominal = p; p == nil {
				r.score, r.miss, r.lost, r.unmet, r.off = math.Inf(1), math.Inf(1), math.Inf(1), math.MaxInt, true
				return r
			}
			if x.c.Hold != nil {
				holdFrom = p
			}
		}
		see(p)
		if i == 0 {
			r.off = len(unmet) > 0
		}
		if p == nil {
			continue
		}
		for _, caution := range solve.Cautions(p) {
			r.burnt = r.burnt || caution.Kind == "rating"
		}
		for _, l := range x.leans(at.c) {
			for _, up := range l.ups {
				first := x.moved(at.c, values, l.d(p), up)
				if first == nil {
					continue
				}
				there := cold(at.moved, first)
				see(there)
				if there == nil {
					continue
				}
				// The derivatives there may point elsewhere.
				if second := x.moved(at.c, values, l.d(there), up); second != nil && !slices.Equal(first, second) {
					see(cold(at.moved, second))
				}
			}
		}
	}
	r.unmet = len(unmet)
	return r
}

// A lean is what tolerances are turned against: derivatives at a point, and the ways that
// hurt.
type lean struct {
	d   func(p *solve.Point) []float64
	ups []bool
}

// leans are a keep one way, a target or hold both ways.
func (x *exhaustive) leans(at *netlist.Circuit) []lean {
	slope := func(p *solve.Point, q *netlist.Expr) []float64 {
		_, d, err := p.Sensitivity(q)
		if err != nil {
			x.t.Fatal(err)
		}
		return d
	}
	var out []lean
	both := func(q *netlist.Expr) {
		out = append(out, lean{func(p *solve.Point) []float64 { return slope(p, q) }, []bool{false, true}})
	}
	for i := range at.Targets {
		both(at.Targets[i].Q)
	}
	for i := range at.Keeps {
		k := &at.Keeps[i]
		out = append(out, lean{func(p *solve.Point) []float64 {
			d := slope(p, k.Left)
			for i, less := range slope(p, k.Right) {
				d[i] -= less
			}
			return d
		}, []bool{!k.Greater}})
	}
	if at.Hold != nil {
		both(at.Hold.Q)
	}
	return out
}

// moved puts every tolerance at the end that moves what has the derivatives d up or
// down; nil where none does.
func (x *exhaustive) moved(at *netlist.Circuit, values, d []float64, up bool) []float64 {
	raised := map[netlist.SlotID]bool{}
	for _, group := range x.drawn {
		sum := 0.0
		for _, id := range group {
			low, high := ends(&at.Slots[id], values[id])
			sum += d[id] * (high - low)
		}
		for _, id := range group {
			if d[id] != 0 {
				raised[id] = sum > 0 == up
			}
		}
	}
	if len(raised) == 0 {
		return nil
	}
	// One at a time, as a file reads: each number is that of what it follows, as drawn, and
	// keeps its own end while later ones are drawn.
	out := slices.Clone(values)
	own := map[netlist.SlotID]float64{}
	keep := func(id netlist.SlotID, number float64) float64 {
		if v, ok := own[id]; ok {
			return v
		}
		return number
	}
	draw := func(id netlist.SlotID) {
		high, drawn := raised[id]
		if _, done := own[id]; !drawn || done {
			return
		}
		low, top := ends(&at.Slots[id], out[id])
		if own[id] = low; high {
			own[id] = top
		}
		out[id] = own[id]
		at.PropagateWith(out, keep)
	}
	for _, id := range at.Givens {
		draw(id)
	}
	for _, group := range x.drawn {
		for _, id := range group {
			draw(id)
		}
	}
	return out
}

// ends of a tolerance; no number here is negative.
func ends(s *netlist.Slot, value float64) (low, high float64) {
	if r := s.Bounds.Relative; r != 0 {
		return value * (1 - r), value * (1 + r)
	}
	return s.Bounds.Low, s.Bounds.High
}

// best tries everything and sorts it.
func (x *exhaustive) best(exact []float64) []result {
	var all []result
	count := make([]int, len(x.grids))
	for {
		ohms := make([]float64, len(count))
		away := 0.0
		for i, k := range count {
			ohms[i] = x.grids[i][k]
			d := math.Log(ohms[i] / exact[i])
			away += d * d
		}
		r := x.judge(ohms)
		r.away = away
		all = append(all, r)
		i := len(count) - 1
		for ; i >= 0; i-- {
			if count[i]++; count[i] < len(x.grids[i]) {
				break
			}
			count[i] = 0
		}
		if i < 0 {
			break
		}
	}
	sort.SliceStable(all, func(i, j int) bool {
		a, b := all[i], all[j]
		switch {
		case a.burnt != b.burnt:
			return b.burnt
		case a.unmet == 0 != (b.unmet == 0):
			return a.unmet == 0
		case a.off != b.off:
			return b.off
		case differ(a.miss, b.miss):
			return a.miss < b.miss
		case differ(a.lost, b.lost):
			return a.lost < b.lost
		case differ(a.score, b.score):
			return a.score < b.score
		}
		return a.away < b.away-alike
	})
	return all
}

// alike is a difference of misses or scores that rounding may turn round.
const alike = 1e-8

func differ(a, b float64) bool { return a != b && !(math.Abs(a-b) <= alike) }

// missed is by how much a requirement is missed, from what the file says of it.
func missed(c *netlist.Circuit, v *solve.Verdict) float64 {
	half := func(within float64, relative bool, about float64) float64 {
		if relative {
			return within * math.Abs(about)
		}
		return within
	}
	by := 0.0
	switch v.Kind {
	case "target":
		target := &c.Targets[v.Index]
		by = math.Abs(v.Value-target.Value)/half(target.Within, target.Relative, target.Value) - 1
	case "hold":
		middle := (v.Low + v.High) / 2
		by = math.Abs(v.Value-middle)/half(c.Hold.Within, c.Hold.Relative, middle) - 1
	default:
		bound := v.High
		if c.Keeps[v.Index].Greater {
			bound = v.Low
		}
		by = math.Abs(v.Value-bound) / math.Abs(bound) // no bound here is 0
	}
	return math.Max(by, 0)
}

// gridOf lists the values of a series between two of its values, both included, by the
// tables of IEC 60063.
func gridOf(t *testing.T, series string, low, high float64) []float64 {
	t.Helper()
	s, ok := quantity.Series(series)
	if !ok {
		t.Fatal(series)
	}
	var out []float64
	for decade := -3; decade < 10; decade++ {
		for _, v := range s.Values() {
			v, err := strconv.ParseFloat(fmt.Sprintf("%ge%d", v, decade), 64)
			if err != nil {
				t.Fatal(err)
			}
			if v >= low && v <= high {
				out = append(out, v)
			}
		}
	}
	return out
}

// compare finds values both ways and holds the short list against everything there is.
func compare(t *testing.T, name, text string, o choose.Options) {
	t.Helper()
	c := read(t, name, text)
	a, err := choose.Find(c, o)
	if err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	if !a.Reached {
		t.Fatalf("out of reach: %+v\n%s", a.Exact.Requirements, text)
	}
	x := newExhaustive(t, c, a)
	var exact []float64
	for _, u := range a.Unknowns {
		grid := gridOf(t, u.Series, u.Low, u.High)
		if len(grid) != u.Count {
			t.Fatalf("%s: %d values searched, %d between %g and %g", u.Name, u.Count, len(grid), u.Low, u.High)
		}
		// A grid that was not narrowed begins and ends a decade away: the next value beyond
		// is further than that.
		if a.Whole {
			s, _ := quantity.Series(u.Series)
			below, _ := s.Neighbours(math.Nextafter(u.Low, 0))
			_, above := s.Neighbours(math.Nextafter(u.High, math.Inf(1)))
			if below >= u.Exact/10 || above <= 10*u.Exact || u.Low < u.Exact/10 || u.High > 10*u.Exact {
				t.Errorf("%s: searched %g .. %g about %g", u.Name, u.Low, u.High, u.Exact)
			}
		}
		x.grids, exact = append(x.grids, grid), append(exact, u.Exact)
	}
	all := x.best(exact)
	if want := min(len(all), max(o.List, 5)); o.List == 0 && len(a.Choices) != want {
		t.Errorf("%d choices, want %d", len(a.Choices), want)
	}
	for i, got := range a.Choices {
		want := all[i]
		if len(got.Ratings) > 0 != want.burnt || got.Unmet != want.unmet && want.unmet != math.MaxInt || differ(got.Miss, math.Max(want.miss, want.lost)) || differ(got.Score, want.score) {
			t.Errorf("%s, place %d: %v with %d unmet, score %.12g, ratings %v; exhaustive has %+v\n%s", name, i+1, got.Ohms, got.Unmet, got.Score, got.Ratings, want, text)
			return
		}
		unique := !slices.ContainsFunc(all, func(r result) bool {
			return !slices.Equal(r.ohms, want.ohms) && r.burnt == want.burnt && !differ(r.miss, want.miss) && !differ(r.lost, want.lost) && !differ(r.score, want.score)
		})
		if unique && !slices.Equal(got.Ohms, want.ohms) {
			t.Errorf("%s, place %d: %v, exhaustive has %v", name, i+1, got.Ohms, want.ohms)
		}
	}
}

// The short list is that of an exhaustive search of the stated grid, on every circuit
// that ships with one to three of its resistors reopened.
func TestAgainstExhaustiveSearch(t *testing.T) {
	files, err := filepath.Glob(filepath.Join("..", "..", "testdata", "circuits", "*.bias"))
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]bool{}
	for _, x := range []struct {
		circuit, more string
		reopen        string
		most          int
	}{
		{circuit: "mast-lamp", reopen: "RE=E24"},
		{circuit: "mast-lamp", reopen: "RE=E6 R1=E3"},
		{circuit: "mast-resistor", reopen: "RS=E192"},
		{circuit: "mast-divider", reopen: "R1=E3 R2=E3"},
		{circuit: "mast-limiter", reopen: "RE=E6 R1=E3"},
		{circuit: "mast-zener", reopen: "RE=E6 R1=E3"},
		{circuit: "pressure-source", reopen: "RE=E96"},
		{circuit: "pressure-source", reopen: "RE=E6 RB=E3"},
		{circuit: "pressure-source", reopen: "RE=E3 RB=E3 BRIDGE=E3"},
		{circuit: "sensor-bank", reopen: "RSET=E12"},
		{circuit: "sensor-bank", reopen: "RP1=E3 RP2=E3"},
		{circuit: "sensor-bank", reopen: "RP1=E24 RP2=E24 RP3=E24", most: 27},
		{circuit: "bootstrap", reopen: "RE=E12"},
		{circuit: "bootstrap-start", reopen: "RE=E6 RS=E3"},
		{circuit: "w1", more: "target LAMP.I = 12 mA within 5%\n", reopen: "RE=E24 R1=E6"},
		{circuit: "w2", more: "target RL1.I = 1 mA within 5%\ntarget RL8.V = 5 V within 0.5 V\nkeep QO8.Vec > 1 V\n", reopen: "RREF=E6 RL8=E3"},
		{circuit: "w2", more: "target RL1.I = 1 mA within 5%\n", reopen: "RREF=E3 RN1=E3 RE1=E3"},
	} {
		seen[x.circuit+".bias"] = true
		t.Run(x.circuit+" "+x.reopen, func(t *testing.T) {
			t.Parallel()
			o := choose.Options{Workers: 2, Most: x.most}
			for _, word := range strings.Fields(x.reopen) {
				name, series, _ := strings.Cut(word, "=")
				o.Reopen = append(o.Reopen, choose.Reopening{Name: name, Series: series})
			}
			name, text := shipped(t, x.circuit)
			compare(t, name, text+x.more, o)
		})
	}
	for _, file := range files {
		if !seen[filepath.Base(file)] {
			t.Errorf("%s is not among them", file)
		}
	}
}

// The same on random sinks whose base hangs on a divider; everything is drawn within
// what such circuits have (common practice).
func TestAgainstExhaustiveSearchOnRandomSinks(t *testing.T) {
	const sinks, shares = 200, 4
	for share := range uint64(shares) {
		t.Run(fmt.Sprint(share), func(t *testing.T) {
			t.Parallel()
			for seed := share; seed < sinks; seed += shares {
				r := rand.New(rand.NewPCG(seed, 1))
				compare(t, fmt.Sprint("sink ", seed), randomSink(r), choose.Options{})
			}
		})
	}
}

// At the choices that meet everything, no corner of the tolerances is worse than the ones
// that the signs of the derivatives show: all corners of all tolerances are solved.
func TestSignsShowTheWorstCorner(t *testing.T) {
	const sinks = 60
	judged := 0
	for seed := range uint64(sinks) {
		text := randomSink(rand.New(rand.NewPCG(seed, 3)))
		c := read(t, "sink.bias", text)
		a, err := choose.Find(c, choose.Options{List: 1})
		if err != nil {
			t.Fatal(err)
		}
		if len(a.Choices) == 0 || !a.Choices[0].Met() {
			continue
		}
		judged++
		x := newExhaustive(t, c, a)
		best := &a.Choices[0]
		if score, met := x.everyCorner(best.Ohms); !met || score > best.Score*(1+1e-9) {
			t.Errorf("%v: %.9g at every corner, %.9g found, met %v\n%s", best.Ohms, score, best.Score, met, text)
		}
	}
	if judged < sinks/10 {
		t.Errorf("only %d choices met everything", judged)
	}
}

// everyCorner is the largest deviation of a target over all corners of ranges and
// tolerances, and whether all is met there.
func (x *exhaustive) everyCorner(ohms []float64) (score float64, met bool) {
	var nominal *solve.Point
	met = true
	for i, at := range x.corners {
		values := at.c.Values()
		for k, id := range x.slots {
			values[id] = ohms[k]
		}
		at.c.Propagate(values)
		if i == 0 && x.c.Hold != nil {
			nominal = cold(at.plain, values)
		}
		for k := range 1 << len(x.drawn) {
			turned := slices.Clone(values)
			for g, group := range x.drawn {
				for _, id := range group {
					low, high := ends(&at.c.Slots[id], turned[id])
					if turned[id] = low; k>>g&1 == 1 {
						turned[id] = high
					}
				}
			}
			for _, v := range solve.Judge(cold(at.moved, turned), nominal) {
				met = met && v.Met
				if v.Kind == "target" {
					score = math.Max(score, choose.Deviation(&v))
				}
			}
		}
	}
	return score, met
}

func randomSink(r *rand.Rand) string {
	pick := func(of ...string) string { return of[r.IntN(len(of))] }
	between := func(low, high float64) float64 { return low * math.Pow(high/low, r.Float64()) }
	var b strings.Builder
	supply := between(5, 24)
	fmt.Fprintf(&b, "rail VCC = %.3g V", supply)
	if r.IntN(2) == 0 {
		fmt.Fprintf(&b, " (%.3g V .. %.3g V)", 0.9*supply, 1.1*supply)
	}
	beta := between(60, 400)
	fmt.Fprintf(&b, "\npart gp npn Vbe = %.3g V at 1 mA, betaF = %.3g", between(0.58, 0.7), beta)
	if r.IntN(3) == 0 {
		fmt.Fprintf(&b, " (%.3g .. %.3g)", beta/2, beta*2)
	}
	amps := between(0.2e-3, 20e-3)
	volts := supply * (0.2 + 0.2*r.Float64())             // at the base
	re := (volts - 0.65) / amps                           // about; the rest is what is looked for
	tolerance := pick("", "", " 1%", " 5%")               // of resistors
	current := amps / 10 * between(0.7, 2)                // through the divider
	upper, lower := (supply-volts)/current, volts/current // ohm
	resistor := func(name string, ohms float64, open bool, series string) string {
		if open {
			return name + " ? " + series + tolerance
		}
		return fmt.Sprintf("%s %.3g%s", name, ohms, tolerance)
	}
	// Two are open, or RE alone in a finer series.
	series := "E3"
	two := r.IntN(2) == 0
	if !two {
		series = pick("E6", "E12", "E24")
	}
	fmt.Fprintf(&b, "\npath VCC -> %s -> base -> %s -> gnd\n", resistor("RU", upper, two, series), resistor("RD", lower, false, ""))
	fmt.Fprintf(&b, "path VCC -> RL %.3g -> out -> Q1 gp base=base -> tail -> %s -> gnd\n", 0.3*supply/amps, resistor("RE", re, true, series))
	fmt.Fprintf(&b, "target Q1.Ic = %.3g mA within %d%%\n", amps*1e3, 3+r.IntN(20))
	if r.IntN(2) == 0 {
		fmt.Fprintf(&b, "keep Q1.Vce > %.2g V\n", 0.1*supply)
	}
	if r.IntN(3) == 0 {
		fmt.Fprintf(&b, "keep VCC.I < %.3g mA\n", 1.3*amps*1e3)
	}
	if r.IntN(3) == 0 {
		fmt.Fprintf(&b, "hold Q1.Ic within %d%%\n", 5+r.IntN(20))
	}
	return b.String()
}
