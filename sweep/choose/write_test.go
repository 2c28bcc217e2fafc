package choose_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"biaswright/netlist/quantity"
	"biaswright/sweep/choose"
)

// A choice stands in the text where the open value stood; all else stays as it was.
func TestWrite(t *testing.T) {
	for _, x := range []struct {
		name, text, want string
		choice           choose.Choice
		reopen           []choose.Reopening
	}{
		{
			name:   "comments and layout stay",
			text:   "rail V = 9 V # supply\n\n# the divider\npath V   ->  RU 2k->tap -> # lower half\n  RD   ?   E24   1%   0.25 W -> gnd\ntarget tap.V = 3 V within 5%\n",
			want:   "rail V = 9 V # supply\n\n# the divider\npath V   ->  RU 2k->tap -> # lower half\n  RD   1k   1%   0.25 W -> gnd\ntarget tap.V = 3 V within 5%\n",
			choice: choose.Choice{Ohms: []float64{1000}},
		},
		{
			name:   "a stated value, a code, a given value",
			text:   "given RL = 2 kohm\nrail V = 9 V\npath V -> RU RL 1% -> tap -> RD 1k0 2% -> gnd\npath tap -> RX R22 -> gnd\ntarget tap.V = 0.01 V within 90%",
			want:   "given RL = 2 kohm\nrail V = 9 V\npath V -> RU 1.8k 1% -> tap -> RD 470 2% -> gnd\npath tap -> RX 0.47 -> gnd\ntarget tap.V = 0.01 V within 90%",
			choice: choose.Choice{Ohms: []float64{1800, 470, 0.47}},
			reopen: []choose.Reopening{{Name: "RU", Series: "E24"}, {Name: "RD", Series: "E24"}, {Name: "RX", Series: "E24"}},
		},
		{
			name: "a pair in series, and what is said of it",
			text: "rail V = 9 V\npath V -> RU 2k -> tap -> RD ? E24 1% 100 ppm/K -> gnd\n" +
				"load RD\ntarget tap.V = 3 V within 5%\nkeep RD.P < 9 mW + RD.V * 1 mA\nkeep RD.I < 2 mA\nhand tap.V = V * RD / (RU + RD)\n",
			want: "rail V = 9 V\npath V -> RU 2k -> tap -> RD 910 1% 100 ppm/K -> RD_2 91 1% 100 ppm/K -> gnd\n" +
				"load RD RD_2\ntarget tap.V = 3 V within 5%\nkeep (RD.P + RD_2.P) < 9 mW + (RD.V + RD_2.V) * 1 mA\nkeep RD.I < 2 mA\nhand tap.V = V * (RD + RD_2) / (RU + (RD + RD_2))\n",
			choice: choose.Choice{Ohms: []float64{1001}, Pairs: []*choose.Pair{{A: 910, B: 91}}},
		},
		{
			name: "a pair in parallel, a name that is taken, no line end",
			text: "rail V = 9 V\npath V -> D drop 1 V -> RU 2k -> RD ? E12 5%\n  -> gnd # divider\npath V -> RD_2 1k -> gnd\n" +
				"batch RU RD\ntarget RD.V = 3 V within 5%\nkeep RD.I < RD.V / RD + 1 mA",
			want: "rail V = 9 V\npath V -> D drop 1 V -> RU 2k -> RD 2.2k 5%\n  -> gnd # divider\npath RU:RD -> RD_3 1.8k 5% -> gnd\npath V -> RD_2 1k -> gnd\n" +
				"batch RU RD RD_3\ntarget RD.V = 3 V within 5%\nkeep (RD.I + RD_3.I) < RD.V / parallel(RD, RD_3) + 1 mA",
			choice: choose.Choice{Ohms: []float64{990}, Pairs: []*choose.Pair{{A: 2200, B: 1800, Parallel: true}}},
		},
	} {
		t.Run(x.name, func(t *testing.T) {
			a := find(t, x.text, x.reopen...)
			got, err := a.Write([]byte(x.text), &x.choice)
			if err != nil {
				t.Fatal(err)
			}
			if d := cmp.Diff(x.want, string(got)); d != "" {
				t.Error(d)
			}
			read(t, "copy.bias", string(got))
		})
	}
}

// What is written reads as the circuit that was chosen, pairs included.
func TestWhatIsWrittenIsWhatWasChosen(t *testing.T) {
	const sinks = 12
	pairs := 0
	for seed := range uint64(sinks) {
		text := randomSink(rand.New(rand.NewPCG(seed, 2)))
		a, err := choose.Find(read(t, "sink.bias", text), choose.Options{Pair: true})
		if err != nil {
			t.Fatal(err)
		}
		for i := range a.Choices {
			c := &a.Choices[i]
			if c.Pairs != nil {
				pairs++
			}
			copied, err := a.Write([]byte(text), c)
			if err != nil {
				t.Fatal(err)
			}
			if err := a.Verify(c, read(t, "copy.bias", string(copied))); err != nil {
				t.Errorf("%v\n%s", err, copied)
			}
		}
	}
	if pairs == 0 {
		t.Error("no pair among them")
	}
}

func TestVerifyTellsAnotherCircuit(t *testing.T) {
	const text = "rail V = 9 V\npath V -> RU 2k -> tap -> RD ? E24 -> gnd\ntarget tap.V = 3 V within 5%\n"
	a := find(t, text)
	other := strings.Replace(text, "? E24", "1001", 1)
	if err := a.Verify(&a.Choices[0], read(t, "other.bias", other)); err == nil {
		t.Error("1001 ohm passes for 1 kohm")
	}
}

// The best pair is that of all pairs there are, one in a hundred apart at most: a
// current source makes the deviation of a voltage that of the resistance.
func TestPairsAreTheNearest(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		series := rapid.SampledFrom([]string{"E3", "E6", "E12", "E24"}).Draw(r, "series")
		ohms := math.Exp(rapid.Float64Range(math.Log(100), math.Log(1e5)).Draw(r, "ln ohms"))
		const width = 1e-6 // no value of a series is so near
		a, err := choose.Find(read(t, "a.bias", fmt.Sprintf("path gnd -> I1 1 mA -> a -> R ? %s -> gnd\ntarget a.V = %.17g V within 0.0001%%\n", series, ohms/1000)), choose.Options{Pair: true})
		if err != nil {
			r.Fatal(err)
		}
		values := gridOf(t, series, 0.9, 2e7)
		best := math.Inf(1)
		for i, v := range values {
			for _, u := range values[:i+1] {
				if u < v/100 {
					continue
				}
				for _, both := range []float64{u + v, u * v / (u + v)} {
					best = math.Min(best, math.Abs(both/ohms-1))
				}
			}
		}
		c := a.Choices[0]
		if got := math.Abs(c.Ohms[0]/ohms - 1); got > best*(1+1e-6)+1e-10 || math.Abs(c.Score*width-got) > 1e-9 {
			r.Fatalf("%g by %+v, off by %g (score %g); the nearest pair is off by %g", c.Ohms[0], c.Pair(0), got, c.Score, best)
		}
	})
}

// Where single resistors do, no pair is listed; and of pairs that do, the fewest.
func TestPairsOnlyWhereOneWillNotDo(t *testing.T) {
	const text = "rail V = 9 V\npath V -> RU ? E6 -> tap -> RD ? E6 -> gnd\ntarget tap.V = 3 V within %s\ntarget V.I = 1 mA within 20%%\n"
	for _, x := range []struct {
		within string
		pairs  int // of two values
	}{
		{"10%", 0}, // 6.8k and 3.3k give 2.94 V
		{"0.5%", 1},
	} {
		a, err := choose.Find(read(t, "a.bias", fmt.Sprintf(text, x.within)), choose.Options{Pair: true})
		if err != nil {
			t.Fatal(err)
		}
		c := a.Choices[0]
		got := 0
		for i := range a.Unknowns {
			if p := c.Pair(i); p != nil {
				got++
				e6, _ := quantity.Series("E6")
				if !slices.Contains(gridOf(t, "E6", 1, 1e6), p.A) || e6.Nearest(p.B) != p.B || p.A < p.B || p.Ohms() != c.Ohms[i] {
					t.Errorf("%+v", p)
				}
			}
		}
		if got != x.pairs || !c.Met() || (a.Ideal != nil) != (x.pairs > 0) {
			t.Errorf("within %s: %d pairs, met %v, %v", x.within, got, c.Met(), c.Ohms)
		}
	}
}

func TestOhmsText(t *testing.T) {
	for ohms, want := range map[float64]string{0.22: "0.22", 1: "1", 47: "47", 1800: "1.8k", 10e3: "10k", 4.7e6: "4.7M", 102: "102", 1.02e3: "1.02k"} {
		if got := choose.OhmsText(ohms); got != want {
			t.Errorf("%g is %q, want %q", ohms, got, want)
		}
	}
}
