package reftest

import (
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"strings"
	"testing"
	"time"

	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/solve/every"
	"biaswright/solve/interval"
	"biaswright/solve/mna"
)

// patience ends a search that would hang a test; none comes near it.
const patience = time.Minute

func allPoints(t testing.TB, c *netlist.Circuit, o solve.EveryOptions) *solve.EveryResult {
	t.Helper()
	o.Budget = patience
	r, err := solve.Every(c, o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// TestEveryPoint searches the circuits all of whose points are listed: it finds each one to
// 1e-8 V with its determinant's sign, none besides, and proves that.
func TestEveryPoint(t *testing.T) {
	circuits, err := Points(pointsFile)
	if err != nil {
		t.Fatal(err)
	}
	if len(circuits) != 16 {
		t.Errorf("%d circuits, expected 16", len(circuits))
	}
	for i := range circuits {
		k := &circuits[i]
		t.Run(k.ID, func(t *testing.T) {
			text, err := k.Text()
			if err != nil {
				t.Fatal(err)
			}
			c := read(t, k.ID+".bias", text.Source)
			r := allPoints(t, c, solve.EveryOptions{Workers: 2})
			if !r.Search.Proven || r.Search.Open != 0 || r.Search.Signs != 1 {
				t.Errorf("%+v", r.Search)
			}
			all := r.All()
			if len(all) != len(k.Points) {
				t.Errorf("%d points, %d are listed", len(all), len(k.Points))
			}
			for j, known := range k.Points {
				best, nearest := -1, math.Inf(1)
				for i, p := range all {
					if d := distance(t, p, text, known); d < nearest {
						best, nearest = i, d
					}
				}
				if !(nearest < 1e-8) { // V
					t.Errorf("point %d: the nearest found is %g V away", j, nearest)
				} else if got := all[best].Evidence.Determinant; got != known.Sign {
					t.Errorf("point %d has sign %d, listed as %d", j, got, known.Sign)
				}
			}
			one := allPoints(t, c, solve.EveryOptions{Workers: 1})
			if len(one.Others) != len(r.Others) || one.Search.Boxes != r.Search.Boxes {
				t.Errorf("one worker finds %d points in %d boxes, two %d in %d", len(one.All()), one.Search.Boxes, len(all), r.Search.Boxes)
			}
			t.Logf("%d points in %d boxes; the supplies lead to %d", len(all), r.Search.Boxes, r.Reached)
		})
	}
}

// TestContainment holds every step of a search against the listed points: what held one
// before still does.
func TestContainment(t *testing.T) {
	circuits, err := Points(pointsFile)
	if err != nil {
		t.Fatal(err)
	}
	for i := range circuits {
		k := &circuits[i]
		text, err := k.Text()
		if err != nil {
			t.Fatal(err)
		}
		c := read(t, k.ID+".bias", text.Source)
		s, err := mna.New(c)
		if err != nil {
			t.Fatal(err)
		}
		sys, _, err := s.Neutral()
		if err != nil {
			t.Fatal(err)
		}
		var known [][]interval.I
		for _, p := range allPoints(t, c, solve.EveryOptions{}).All() {
			v := every.Verify(sys, p.Unknowns(), 0)
			if v == nil {
				t.Fatalf("%s: a point cannot be verified", k.ID)
			}
			known = append(known, v.Coordinates())
		}
		checks := 0
		every.Search(sys, every.Options{Check: func(step string, before, after []interval.I) {
			checks++
			for _, x := range known {
				held := true
				for i := range x {
					held = held && before[i].Lo <= x[i].Lo && x[i].Hi <= before[i].Hi
				}
				if !held {
					continue
				}
				if after == nil {
					t.Errorf("%s: %s emptied a box that holds a point", k.ID, step)
					continue
				}
				for i := range x { // the point lies somewhere in its own small box: the two meet
					if after[i].Meet(x[i]).Empty() {
						t.Errorf("%s: %s lost a point", k.ID, step)
					}
				}
			}
		}})
		if checks == 0 {
			t.Errorf("%s: no step was checked", k.ID)
		}
	}
}

// feedback draws a network of transistors with feedback everywhere: each terminal hangs on
// a few shared nodes, which resistors tie to each other and to the supply.
func feedback(number uint64, transistors int) string {
	d := &draw{Rand: rand.New(rand.NewPCG(number, 0x6665656462))} // any fixed second word
	var b strings.Builder
	b.WriteString("rail V = 5 V\npart n npn Isat = 1e-15 A, betaF = 80, betaR = 2\npart p pnp Isat = 1e-15 A, betaF = 50, betaR = 1\n")
	nodes := transistors + 2
	for i := range nodes {
		fmt.Fprintf(&b, "path V -> RA%d %g -> x%d -> RB%d %g -> gnd\n", i, d.decade(1e3, 1e6), i, i, d.decade(1e3, 1e6))
	}
	for i := range transistors {
		a := d.IntN(nodes)
		base := (a + 1 + d.IntN(nodes-1)) % nodes
		if d.IntN(2) == 0 {
			fmt.Fprintf(&b, "path x%d -> Q%d n base=x%d -> e%d -> RE%d %g -> gnd\n", a, i, base, i, i, d.decade(10, 3e3))
		} else {
			fmt.Fprintf(&b, "path V -> RE%d %g -> e%d -> Q%d p base=x%d -> x%d\n", i, d.decade(10, 3e3), i, i, base, a)
		}
	}
	return b.String()
}

// TestSureAndQuick searches random networks with feedback both ways. The sure one proves
// its list; the quick one finds no point that is not on it. Where it misses some, they come
// in pairs, one of each sign, on branches of their own that no way followed leads to: the
// signs that it has found add up to +1 all the same.
func TestSureAndQuick(t *testing.T) {
	networks := 300
	if raceDetector {
		networks = 40 // it makes each ten times as long, and one goroutine is like another
	}
	several, fewer, boxes := 0, 0, 0
	for i := range networks {
		text := feedback(uint64(i), 3+i%8)
		c := read(t, fmt.Sprintf("feedback-%d.bias", i), []byte(text))
		sure := allPoints(t, c, solve.EveryOptions{Workers: 2})
		if !sure.Search.Proven || sure.Search.Signs != 1 {
			t.Errorf("network %d: %+v\n%s", i, sure.Search, text)
			continue
		}
		boxes += sure.Search.Boxes
		if len(sure.Others) > 0 {
			several++
		}
		quick := allPoints(t, c, solve.EveryOptions{Quick: true})
		for _, p := range quick.All() {
			nearest := math.Inf(1)
			for _, q := range sure.All() {
				far := 0.0
				for n := range p.NodeV {
					far = math.Max(far, math.Abs(p.NodeV[n]-q.NodeV[n]))
				}
				nearest = math.Min(nearest, far)
			}
			if nearest > 1e-8 { // V
				t.Errorf("network %d: the quick way has a point %g V from any that is proven", i, nearest)
			}
		}
		if missed := len(sure.Others) - len(quick.Others); missed > 0 {
			fewer++
			if missed%2 != 0 || quick.Search.Signs != 1 {
				t.Errorf("network %d: the quick way misses %d points, and its signs add up to %+d", i, missed, quick.Search.Signs)
			}
		}
	}
	if fewer == 0 && !raceDetector {
		t.Error("the quick way misses nothing any more: say so where it is described")
	}
	t.Logf("%d networks in %d boxes, %d with several points; the quick way misses some in %d", networks, boxes, several, fewer)
}

// TestBanksAreUnique proves mirror banks and trees of mirrors unique by the first box
// alone.
func TestBanksAreUnique(t *testing.T) {
	for _, size := range []struct {
		n     int
		early bool
	}{{4, true}, {10, true}, {30, true}, {4, false}, {60, false}, {90, false}} {
		if raceDetector && size.n > 10 {
			continue // one goroutine, and ten times as long
		}
		c := read(t, "bank.bias", []byte(bank(size.n, size.early)))
		s, err := mna.New(c)
		if err != nil {
			t.Fatal(err)
		}
		sys, _, err := s.Neutral()
		if err != nil {
			t.Fatal(err)
		}
		r := every.Search(sys, every.Options{RootOnly: true, Known: [][]float64{point(t, c).Unknowns()}})
		if len(r.Points) != 1 || r.Open != 0 || r.Boxes != 1 {
			t.Errorf("%+v: %d points, %d boxes, %d open", size, len(r.Points), r.Boxes, r.Open)
		}
	}
}

// bank is an npn mirror of one reference and n - 1 outputs, with emitter resistors and
// loads; every fourth output turns over into a pnp mirror, so that there are about half
// as many transistors again.
func bank(n int, early bool) string {
	var b strings.Builder
	va := "infinite"
	if early {
		va = "80 V"
	}
	fmt.Fprintf(&b, "rail V = 9 V\npart n npn Isat = 1e-15 A, betaF = 200, VA = %s\npart p pnp Isat = 1e-15 A, betaF = 100, VA = %[1]s\n", va)
	b.WriteString("path V -> RREF 8.2k -> line -> Q0 n base=line -> e0 -> RE0 220 -> gnd\n")
	for i := 1; i < n; i++ {
		if i%4 == 0 && i+2 < n {
			fmt.Fprintf(&b, "path V -> RP%d 220 -> ep%d -> P%d p base=c%d -> c%d -> Q%d n base=line -> e%d -> RE%d 220 -> gnd\n", i, i, i, i, i, i, i, i)
			fmt.Fprintf(&b, "path V -> RS%d 220 -> es%d -> S%d p base=c%d -> o%d -> RL%d 1k -> gnd\n", i, i, i, i, i, i)
			continue
		}
		fmt.Fprintf(&b, "path V -> RL%d 1k -> c%d -> Q%d n base=line -> e%d -> RE%d 220 -> gnd\n", i, i, i, i, i)
	}
	return b.String()
}

// TestEnclosures holds intervals that surely contain the solution against the listed values
// of other solvers: each meets the value, one unit in its last place more or less.
func TestEnclosures(t *testing.T) {
	circuits, err := Points(pointsFile)
	if err != nil {
		t.Fatal(err)
	}
	met := 0
	for i := range circuits {
		k := &circuits[i]
		text, err := k.Text()
		if err != nil {
			t.Fatal(err)
		}
		c := read(t, k.ID+".bias", text.Source)
		for _, p := range allPoints(t, c, solve.EveryOptions{}).All() {
			e, err := solve.Enclose(p)
			if err != nil {
				t.Errorf("%s: %v", k.ID, err)
				continue
			}
			for n, v := range p.NodeV {
				if !(v >= e.NodeV[n].Lo-1e-12 && v <= e.NodeV[n].Hi+1e-12) {
					t.Errorf("%s: node %d at %g V, enclosed %v", k.ID, n, v, e.NodeV[n])
				}
			}
			for _, known := range k.Points {
				if distance(t, p, text, known) > 1e-8 {
					continue
				}
				for name, v := range known.Volts {
					// 17 digits are listed, and the circuit's own numbers are read back
					// from text: a few units in the last place of the largest voltage.
					const last = 1e-15
					box := e.NodeV[node(t, c, text.Node[name])]
					slack := last * math.Max(1, math.Abs(v))
					if box.Hi < v-slack || box.Lo > v+slack {
						t.Errorf("%s: %s listed as %.17g, enclosed %v", k.ID, name, v, box)
					}
					met++
				}
			}
		}
	}
	if met < 200 {
		t.Errorf("%d values compared, expected 200 at least", met)
	}
}

// BenchmarkEvery prints the time of each listed circuit's search and proof, and its boxes. All
// processors are used, as the command does, and the search begins with the point that
// solve gives.
func BenchmarkEvery(b *testing.B) {
	circuits, err := Points(pointsFile)
	if err != nil {
		b.Fatal(err)
	}
	for i := range circuits {
		text, err := circuits[i].Text()
		if err != nil {
			b.Fatal(err)
		}
		c := read(b, circuits[i].ID+".bias", text.Source)
		s, err := mna.New(c)
		if err != nil {
			b.Fatal(err)
		}
		sys, _, err := s.Neutral()
		if err != nil {
			b.Fatal(err)
		}
		o := every.Options{Known: [][]float64{point(b, c).Unknowns()}, Workers: runtime.NumCPU()}
		b.Run(circuits[i].ID, func(b *testing.B) {
			boxes := 0
			for b.Loop() {
				r := every.Search(sys, o)
				if boxes = r.Boxes; r.Open > 0 {
					b.Fatal("not proven")
				}
			}
			b.ReportMetric(float64(boxes), "boxes")
		})
	}
}

// BenchmarkBanks prints the time of the first box against the number of transistors, without
// an Early effect.
func BenchmarkBanks(b *testing.B) {
	for _, n := range []int{4, 16, 64, 90} {
		text := bank(n, false)
		c := read(b, "bank.bias", []byte(text))
		s, err := mna.New(c)
		if err != nil {
			b.Fatal(err)
		}
		sys, _, err := s.Neutral()
		if err != nil {
			b.Fatal(err)
		}
		res, err := solve.Solve(c, solve.Options{})
		if err != nil {
			b.Fatal(err)
		}
		transistors := 0
		for i := range c.Elements {
			if c.Elements[i].Kind == netlist.TransistorPart {
				transistors++
			}
		}
		b.Run(fmt.Sprint(transistors), func(b *testing.B) {
			for b.Loop() {
				r := every.Search(sys, every.Options{RootOnly: true, Known: [][]float64{res.Point.Unknowns()}})
				if r.Open != 0 {
					b.Fatal("not unique by the first box")
				}
			}
		})
	}
}

// TestEnclosuresOfNetworks holds enclosures against the operating points that were solved
// elsewhere to 60 digits: each meets the listed value, one unit in its last place (of
// fifteen digits) more or less.
func TestEnclosuresOfNetworks(t *testing.T) {
	cases, err := Cases(networksFile)
	if err != nil {
		t.Fatal(err)
	}
	met := 0
	for i := range cases {
		c := &cases[i]
		if c.Analysis != "operating_point" || c.Has("ideal_opamp") {
			continue
		}
		at := caseAt(t, c)
		p := at.point("")
		e, err := solve.Enclose(p)
		if err != nil {
			t.Errorf("%s: %v", c.ID, err)
			continue
		}
		for _, f := range append(c.Expected, c.Currents...) {
			var box interval.I
			switch {
			case f.At != nil:
				continue
			case f.Node != "":
				box = e.NodeV[node(t, p.Circuit, at.text.Node[f.Node])]
			case f.Probe != nil:
				var ok bool
				if box, ok = at.enclosed(e, f.Probe); !ok {
					continue // an ideal voltage's current
				}
			default:
				continue
			}
			const last = 1e-14 // of a number of fifteen digits
			slack := last * math.Abs(f.Value)
			if box.Hi < f.Value-slack || box.Lo > f.Value+slack {
				t.Errorf("%s: %s is listed as %.17g, enclosed %v", c.ID, f.Name, f.Value, box)
			}
			met++
		}
	}
	if met < 150 {
		t.Errorf("%d values compared, expected 150 at least", met)
	}
	t.Logf("%d values met", met)
}

// enclosed is the enclosure of a terminal's current.
func (s *solved) enclosed(e *solve.Enclosure, probe *Probe) (interval.I, bool) {
	expr, sign := s.terminal(probe)
	if probe.Direction == "out" {
		sign = -sign
	}
	name, symbol, _ := strings.Cut(expr, ".")
	for i := range s.plain.Rails {
		if s.plain.Rails[i].Name == name {
			return e.Rail[i].Scale(sign), true
		}
	}
	for i := range s.plain.Elements {
		if s.plain.Elements[i].Name == name {
			box, ok := e.Current(i, symbol)
			return box.Scale(sign), ok
		}
	}
	return interval.I{}, false
}
