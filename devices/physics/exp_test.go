package physics

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"github.com/cockroachdb/apd/v3"
)

// exact is the arithmetic of the independent values: 50 digits.
var exact = apd.BaseContext.WithPrecision(50)

func decimal(t testing.TB, x float64) *apd.Decimal {
	t.Helper()
	d := new(apd.Decimal)
	// Sixty digits of the double itself, not the shortest that round-trip.
	if _, _, err := d.SetString(new(big.Float).SetFloat64(x).Text('e', 60)); err != nil {
		t.Fatal(err)
	}
	return d
}

// ulps is |got - want| in units in the last place of got.
func ulps(t testing.TB, got float64, want *apd.Decimal) float64 {
	t.Helper()
	diff := new(apd.Decimal)
	if _, err := exact.Sub(diff, decimal(t, got), want); err != nil {
		t.Fatal(err)
	}
	d, err := diff.Float64()
	if err != nil {
		t.Fatal(err)
	}
	got = math.Abs(got)
	return math.Abs(d) / (math.Nextafter(got, math.Inf(1)) - got)
}

func expOf(t testing.TB, x float64) *apd.Decimal {
	t.Helper()
	e := new(apd.Decimal)
	if _, err := exact.Exp(e, decimal(t, x)); err != nil {
		t.Fatal(err)
	}
	return e
}

// arguments are spread over all magnitudes of the table's range, its seams and
// the neighbourhood of 0.
func arguments() []float64 {
	r := rand.New(rand.NewPCG(1, 2))
	xs := []float64{0, 1, -1, 707.9, -707.9, math.Ln2, -math.Ln2, 1e-300, -1e-300}
	for range 1500 {
		xs = append(xs, (2*r.Float64()-1)*tableLimit)
	}
	for range 1500 {
		xs = append(xs, (2*r.Float64()-1)*math.Pow(10, 3*r.Float64()-2)*0.5)
	}
	for k := -300; k <= 300; k++ { // half steps, where the table's entry changes
		x := (float64(k) + 0.5) / stepsPerUnit
		xs = append(xs, x, math.Nextafter(x, 1000))
	}
	return xs
}

// The bounds are the documented ones; the values are computed by apd, whose
// exponential shares nothing with the table.
func TestExpAgainstFiftyDigits(t *testing.T) {
	var worst, worst1 float64
	one := apd.New(1, 0)
	for _, x := range arguments() {
		want := expOf(t, x)
		e, em1 := ExpExpm1(x)
		if e != Exp(x) {
			t.Fatalf("ExpExpm1(%v) gives %v, Exp %v", x, e, Exp(x))
		}
		worst = max(worst, ulps(t, e, want))
		minus := new(apd.Decimal)
		if math.Abs(x) < 1e-30 { // e^x - 1 = x to 30 digits, which apd would cancel
			minus = decimal(t, x)
		} else if _, err := exact.Sub(minus, want, one); err != nil {
			t.Fatal(err)
		}
		u := ulps(t, em1, minus)
		if u > 1.5 {
			t.Errorf("e^x - 1 at %v is off by %.2f units in the last place", x, u)
		}
		worst1 = max(worst1, u)
	}
	t.Logf("worst: e^x %.4f, e^x - 1 %.3f units in the last place", worst, worst1)
	if worst > 0.51 {
		t.Errorf("e^x is off by %.4f units in the last place", worst)
	}
}

func TestExpOutsideTheTable(t *testing.T) {
	for _, x := range []float64{708, 709.7, 710, -708, -720, -745, -746, math.Inf(1), math.Inf(-1), math.NaN(), 1e300, -1e300} {
		if got, want := Exp(x), math.Exp(x); got != want && !(math.IsNaN(got) && math.IsNaN(want)) {
			t.Errorf("Exp(%v) = %v, want %v", x, got, want)
		}
		_, got := ExpExpm1(x)
		if want := math.Expm1(x); got != want && !(math.IsNaN(got) && math.IsNaN(want)) {
			t.Errorf("ExpExpm1(%v) = %v, want %v", x, got, want)
		}
	}
}

// Each entry of the table is 2^(j/128), recomputed as exp(j ln2/128).
func TestPowers(t *testing.T) {
	ln2 := new(apd.Decimal)
	if _, err := exact.Ln(ln2, apd.New(2, 0)); err != nil {
		t.Fatal(err)
	}
	for j, p := range powers {
		want := new(apd.Decimal)
		exact.Mul(want, ln2, apd.New(int64(j), 0))
		exact.Quo(want, want, apd.New(128, 0))
		exact.Exp(want, want)
		if u := ulps(t, p.high, want); u > 0.5 {
			t.Errorf("entry %d is off by %.3f units in the last place", j, u)
		}
		sum := decimal(t, p.rest)
		exact.Mul(sum, sum, decimal(t, p.high))
		exact.Add(sum, sum, decimal(t, p.high))
		exact.Sub(sum, sum, want)
		// high and rest together hold 106 bits: 2^-106 is 1.2e-32.
		if d, _ := sum.Float64(); math.Abs(d) > 3e-32 {
			t.Errorf("entry %d with its rest is off by %g", j, d)
		}
	}
}

var sink float64

func BenchmarkExp(b *testing.B) {
	x := -20.0
	for range b.N {
		sink = Exp(x)
		x += 1e-6
	}
}

func BenchmarkExpOfTheStandardLibrary(b *testing.B) {
	x := -20.0
	for range b.N {
		sink = math.Exp(x)
		x += 1e-6
	}
}

func BenchmarkJunction(b *testing.B) {
	x := -20.0
	for range b.N {
		f, df := Junction(x, 60)
		sink = f + df
		x += 1e-6
	}
}
