package reftest

import (
	"math"
	"testing"
	"time"

	"biaswright/solve/every"
	"biaswright/solve/mna"
)

// TestEveryPoint searches the circuits all of whose points are listed: it must find each
// one within 1e-8 V, none besides, and leave no box open.
func TestEveryPoint(t *testing.T) {
	circuits, err := Points(pointsFile)
	if err != nil {
		t.Fatal(err)
	}
	for i := range circuits {
		k := &circuits[i]
		t.Run(k.ID, func(t *testing.T) {
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
			start := time.Now()
			r := every.Search(sys, every.Options{Budget: 20 * time.Second})
			t.Logf("%d unknowns, %d exponentials, %d products: %d points of %d, %d boxes, %d open, %v", sys.N, len(sys.Exps), len(sys.Prods), len(r.Points), len(k.Points), r.Boxes, r.Open, time.Since(start))
			if len(r.Points) != len(k.Points) || r.Open != 0 {
				t.Errorf("%d points, %d listed, %d open", len(r.Points), len(k.Points), r.Open)
			}
			for j, known := range k.Points {
				nearest := math.Inf(1)
				for _, p := range r.Points {
					x := make([]float64, sys.N)
					for i := range x {
						x[i] = p.X[i].Mid()
					}
					v := s.StateAt(x).V
					far := 0.0
					for name, volts := range known.Volts {
						far = max(far, math.Abs(v[node(t, c, text.Node[name])]-volts))
					}
					nearest = min(nearest, far)
				}
				if nearest > 1e-8 {
					t.Errorf("point %d: the nearest found is %g V away", j, nearest)
				}
			}
		})
	}
}
