package follow

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"strconv"
	"testing"
)

// The reference circuits, with points proven by interval arithmetic and folds
// computed to ten digits; their file tells sources and methods.
const referenceFile = "../../testdata/reference/operating-points.json"

type reference struct {
	ID       string
	VT       float64 `json:"V_T"`
	Ground   string
	Elements []struct {
		Type, Name, A, B, Plus, Minus, Anode, Cathode string
		Collector, Base, Emitter, Polarity            string
		Ohms, Volts, N                                float64
		IS                                            float64 `json:"I_S"`
		VA                                            float64 `json:"V_A"`
		BetaF                                         float64 `json:"beta_F"`
		BetaR                                         float64 `json:"beta_R"`
	}
	Points []struct {
		Volts map[string]float64 `json:"node_volts"`
		Sign  int                `json:"determinant_sign"`
	} `json:"operating_points"`
	Folds struct {
		Parameter string
		Points    []struct{ Volts string }
	}
}

func references(t *testing.T) []reference {
	t.Helper()
	text, err := os.ReadFile(referenceFile)
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Circuits []reference }
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Circuits) < 16 {
		t.Fatalf("only %d circuits", len(file.Circuits))
	}
	return file.Circuits
}

// system builds the balances of the nodes and the equations of the sources.
// Source gives a source's volts, gain the factor of the transistors' gains, and
// their derivatives to λ.
func (r *reference) system(source func(name string, volts, l float64) (v, dv float64), gain func(l float64) (g, dg float64)) (*system, map[string]int) {
	index := map[string]int{r.Ground: -1}
	n := 0
	node := func(name string) int {
		if i, ok := index[name]; ok {
			return i
		}
		index[name] = n
		n++
		return n - 1
	}
	type part struct {
		pins [3]int
		at   int // in Elements
	}
	var parts []part
	for i, e := range r.Elements {
		var p part
		switch p.at = i; e.Type {
		case "resistor":
			p.pins = [3]int{node(e.A), node(e.B)}
		case "dc voltage source":
			p.pins = [3]int{node(e.Plus), node(e.Minus)}
		case "diode":
			p.pins = [3]int{node(e.Anode), node(e.Cathode)}
		case "transistor":
			p.pins = [3]int{node(e.Collector), node(e.Base), node(e.Emitter)}
		default:
			panic(e.Type)
		}
		parts = append(parts, p)
	}
	for i := range parts {
		if r.Elements[parts[i].at].Type == "dc voltage source" {
			parts[i].pins[2] = n
			n++
		}
	}
	junction := func(v, is, vt float64) (i, g float64) {
		const last = 600 // beyond it the tangent, so that a double can hold it
		u := v / vt
		if u < last {
			return is * math.Expm1(u), is / vt * math.Exp(u)
		}
		e := is * math.Exp(last)
		return e * (1 + u - last), e / vt
	}
	var s *system
	largest := make([]float64, n)
	rounding := make([]float64, n)
	s = newSystem(n, 0, func(x []float64, l float64, f, dl []float64, add func(i, j int, v float64)) {
		clear(f)
		clear(dl)
		clear(largest)
		clear(rounding)
		at := func(i int) float64 {
			if i < 0 {
				return 0
			}
			return x[i]
		}
		put := func(row int, i float64) {
			if row >= 0 {
				f[row] += i
				largest[row] = max(largest[row], math.Abs(i))
			}
		}
		slope := func(row, col int, g float64) {
			if row >= 0 && col >= 0 {
				add(row, col, g)
			}
			if row >= 0 {
				rounding[row] += math.Abs(g * at(col))
			}
		}
		g, dg := gain(l)
		for _, p := range parts {
			e := &r.Elements[p.at]
			a, b, c := p.pins[0], p.pins[1], p.pins[2]
			switch e.Type {
			case "resistor", "diode":
				i, g := (at(a)-at(b))/e.Ohms, 1/e.Ohms
				if e.Type == "diode" {
					i, g = junction(at(a)-at(b), e.IS, e.N*r.VT)
				}
				put(a, i)
				slope(a, a, g)
				slope(a, b, -g)
				put(b, -i)
				slope(b, a, -g)
				slope(b, b, g)
			case "dc voltage source":
				v, dv := source(e.Name, e.Volts, l)
				put(a, x[c])
				put(b, -x[c])
				slope(a, c, 1)
				slope(b, c, -1)
				f[c] = at(a) - at(b) - v
				dl[c] = -dv
				slope(c, a, 1)
				slope(c, b, -1)
			case "transistor":
				sign := 1.0
				if e.Polarity == "pnp" {
					sign = -1
				}
				vbe, vbc := sign*(at(b)-at(c)), sign*(at(b)-at(a))
				cc, gf := junction(vbe, e.IS, r.VT)
				ec, gr := junction(vbc, e.IS, r.VT)
				early, dEarly := 1.0, 0.0
				if e.VA != 0 {
					early, dEarly = 1-vbc/e.VA, -1/e.VA
				}
				// Without gain, what leaves through the base is the same, and
				// the junctions no longer drive each other.
				it := (cc - ec) * early
				ic := sign * (g*it - ec/e.BetaR - (1-g)*ec)
				ib := sign * (cc/e.BetaF + ec/e.BetaR + (1-g)*(cc+ec))
				icE := g * gf * early
				icC := g*(-gr*early+(cc-ec)*dEarly) - gr/e.BetaR - (1-g)*gr
				ibE, ibC := gf/e.BetaF+(1-g)*gf, gr/e.BetaR+(1-g)*gr
				icL, ibL := sign*dg*(it+ec), -sign*dg*(cc+ec)
				for _, row := range []struct {
					at           int
					i, de, dc, l float64
				}{{a, ic, icE, icC, icL}, {b, ib, ibE, ibC, ibL}, {c, -ic - ib, -icE - ibE, -icC - ibC, -icL - ibL}} {
					put(row.at, row.i)
					slope(row.at, b, row.de+row.dc)
					slope(row.at, c, -row.de)
					slope(row.at, a, -row.dc)
					if row.at >= 0 {
						dl[row.at] += row.l
					}
				}
			}
		}
		if s == nil {
			return // asked for the pattern
		}
		for i := range s.tol {
			s.tol[i] = 1e-12*largest[i] + 8*epsilon*rounding[i]
		}
	})
	for _, p := range parts {
		if r.Elements[p.at].Type == "dc voltage source" {
			s.scale[p.pins[2]] = 1e-2 // A
		}
	}
	return s, index
}

func (r *reference) find(x []float64, index map[string]int) int {
	for i, p := range r.Points {
		off := 0.0
		for name, v := range p.Volts {
			if k, ok := index[name]; ok && k >= 0 {
				off = max(off, math.Abs(x[k]-v))
			}
		}
		if off < 1e-6 {
			return i
		}
	}
	return -1
}

func fixed(v float64) func(float64) (float64, float64) {
	return func(float64) (float64, float64) { return v, 0 }
}

// Every walk in the supplies from nothing passes an operating point, and every
// point it passes is on the list, with the listed sign up to a common one.
func TestReferenceSupplies(t *testing.T) {
	for _, r := range references(t) {
		t.Run(r.ID, func(t *testing.T) {
			s, index := r.system(func(_ string, volts, l float64) (float64, float64) { return l * volts, volts }, fixed(1))
			res := Follow(s, make([]float64, s.Size()), 0, Options{Low: -2, High: 2, Target: 1, Use: EveryPassage})
			r.passages(t, res, index)
		})
	}
}

// The same for the walk in the gains. Without gains a ramp of the supplies has
// no fold in its way and gives the start.
func TestReferenceGains(t *testing.T) {
	for _, r := range references(t) {
		t.Run(r.ID, func(t *testing.T) {
			s, _ := r.system(func(_ string, volts, l float64) (float64, float64) { return l * volts, volts }, fixed(0))
			start := Follow(s, make([]float64, s.Size()), 0, Options{Mode: Natural, Target: 1, Use: FirstPassage})
			outcome(t, start, Reached)
			s, index := r.system(func(_ string, volts, _ float64) (float64, float64) { return volts, 0 },
				func(l float64) (float64, float64) { return l, 1 })
			// Far beyond real gains, conductances turn negative and nothing is to
			// be learned.
			res := Follow(s, start.X, 0, Options{Low: -1, High: 1.2, Target: 1, Use: EveryPassage, MaxSteps: 1000})
			r.passages(t, res, index)
		})
	}
}

func (r *reference) passages(t *testing.T, res Result, index map[string]int) {
	t.Helper()
	if len(res.Targets) == 0 {
		t.Fatalf("no passage: it %v at %g, %+v", res.Outcome, res.Lambda, res.Stats)
	}
	common := 0
	found := map[int]bool{}
	for _, p := range res.Targets {
		i := r.find(p.X, index)
		if i < 0 {
			t.Errorf("a point that is not listed: %v", p.X)
			continue
		}
		found[i] = true
		if common == 0 {
			common = p.DetSign * r.Points[i].Sign
		}
		if p.DetSign*r.Points[i].Sign != common {
			t.Errorf("point %d has another sign", i)
		}
	}
	t.Logf("%d of %d points; it %v; %d folds, %+v", len(found), len(r.Points), res.Outcome, len(res.Folds), res.Stats)
}

// The folds in one source's volts, to the digits that the reference has.
func TestReferenceFolds(t *testing.T) {
	for _, r := range references(t) {
		if len(r.Folds.Points) == 0 {
			continue
		}
		t.Run(r.ID, func(t *testing.T) {
			var moved string
			if _, err := fmt.Sscanf(r.Folds.Parameter, "value in volts of source %s", &moved); err != nil {
				t.Fatal(err)
			}
			volts := 0.0
			for _, e := range r.Elements {
				if e.Name == moved {
					volts = e.Volts
				}
			}
			s, index := r.system(func(name string, v, l float64) (float64, float64) {
				if name == moved {
					return l, 1
				}
				return v, 0
			}, fixed(1))
			missing := map[float64]bool{}
			for _, p := range r.Folds.Points {
				v, err := strconv.ParseFloat(p.Volts, 64)
				if err != nil {
					t.Fatal(err)
				}
				missing[v] = true
			}
			for i := range r.Points {
				x := make([]float64, s.Size())
				for name, v := range r.Points[i].Volts {
					if k, ok := index[name]; ok && k >= 0 {
						x[k] = v
					}
				}
				for _, direction := range []int{-1, 1} {
					if len(missing) == 0 {
						return
					}
					res := Follow(s, x, volts, Options{Low: -5, High: 20, Direction: direction, LambdaScale: 10})
					if res.Outcome == BadStart || res.Outcome == Stuck {
						t.Errorf("point %d: it %v at %g, %+v", i, res.Outcome, res.Lambda, res.Stats)
					}
					for _, f := range res.Folds {
						for v := range missing {
							// The reference has ten digits or more.
							if math.Abs(f.Lambda-v) < 1e-9*math.Abs(v) {
								delete(missing, v)
							}
						}
					}
				}
			}
			if len(missing) > 0 {
				t.Errorf("not found: %v", missing)
			}
		})
	}
}
