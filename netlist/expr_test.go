package netlist

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// table is an environment of plain numbers; a quantity's is that of its index.
type table []float64

func (t table) Slot(id SlotID) float64         { return t[id] }
func (t table) Quantity(r Ref) (float64, bool) { return t[r.Index], !math.IsNaN(t[r.Index]) }
func steps(ops ...op) *Expr                    { return &Expr{ops: ops} }
func two(code opcode) *Expr {
	return steps(op{code: opSlot, a: 0}, op{code: opSlot, a: 1}, op{code: code, a: 0, b: 1})
}
func one(code opcode) *Expr { return steps(op{code: opSlot, a: 0}, op{code: code, a: 0}) }

func TestEval(t *testing.T) {
	for _, tt := range []struct {
		name string
		e    *Expr
		env  table
		want float64
	}{
		{"sum", two(opAdd), table{2, 3}, 5},
		{"difference", two(opSubtract), table{2, 3}, -1},
		{"product", two(opMultiply), table{2, 3}, 6},
		{"quotient", two(opDivide), table{3, 2}, 1.5},
		{"power", two(opPower), table{2, 10}, 1024},
		{"two equal resistors in parallel are half of one", two(opParallel), table{10, 10}, 5},
		{"6 and 3 in parallel are 2", two(opParallel), table{6, 3}, 2},
		{"a link beside a resistor is a link", two(opParallel), table{0, 3}, 0},
		{"two links are a link", two(opParallel), table{0, 0}, 0},
		{"an open branch changes nothing", two(opParallel), table{math.Inf(1), 3}, 3},
		{"minus", one(opNegate), table{2}, -2},
		{"root", one(opSqrt), table{9}, 3},
		{"ln e = 1", one(opLn), table{math.E}, 1},
		{"exp 0 = 1", one(opExp), table{0}, 1},
	} {
		t.Run(tt.name, func(t *testing.T) {
			got, ok := tt.e.Eval(tt.env)
			if !ok || math.Abs(got-tt.want) > 1e-15*math.Abs(tt.want) {
				t.Errorf("got %v, %v; want %v", got, ok, tt.want)
			}
		})
	}
}

func TestEvalWithoutNumber(t *testing.T) {
	missing := &Expr{ops: []op{{code: opQuantity}}, refs: []Ref{{Index: 0}}}
	for name, e := range map[string]*Expr{"a quantity without number": missing, "the root of a negative number": one(opSqrt)} {
		env := table{-1}
		if e == missing {
			env[0] = math.NaN()
		}
		if v, ok := e.Eval(env); ok || !math.IsNaN(v) {
			t.Errorf("%s: got %v, %v", name, v, ok)
		}
	}
}

// The gradient is compared with central differences, whose error is of the order
// of the step squared.
func TestGradAgainstDifferences(t *testing.T) {
	codes := []opcode{opAdd, opSubtract, opMultiply, opDivide, opParallel, opPower, opNegate, opSqrt, opLn, opExp}
	rapid.Check(t, func(t *rapid.T) {
		const leaves = 3
		env := make(table, leaves)
		e := &Expr{}
		for i := range env {
			env[i] = rapid.Float64Range(0.5, 2).Draw(t, "value")
			code := rapid.SampledFrom([]opcode{opSlot, opQuantity}).Draw(t, "leaf")
			at := int32(i)
			if code == opQuantity {
				e.refs = append(e.refs, Ref{Index: i})
				at = int32(len(e.refs) - 1)
			}
			e.ops = append(e.ops, op{code: code, a: at})
		}
		for range rapid.IntRange(1, 6).Draw(t, "steps") {
			last := int32(len(e.ops) - 1)
			code := rapid.SampledFrom(codes).Draw(t, "code")
			e.ops = append(e.ops, op{code: code, a: last, b: rapid.Int32Range(0, last).Draw(t, "other")})
		}
		vals := make([]float64, len(e.ops))
		if _, ok := e.run(vals, nil, env); !ok {
			t.Skip("no number")
		}
		for _, v := range vals {
			if !(math.Abs(v) < 1e3) {
				t.Skip("near a pole, where differences are not exact enough")
			}
		}
		grad := make([]float64, leaves)
		e.Grad(env, func(id SlotID, d float64) { grad[id] += d }, func(r Ref, d float64) { grad[r.Index] += d })
		for i := range env {
			const h = 1e-6
			up, down := append(table(nil), env...), append(table(nil), env...)
			up[i] += h
			down[i] -= h
			a, okA := e.Eval(up)
			b, okB := e.Eval(down)
			if !okA || !okB {
				t.Skip("at the edge of a domain")
			}
			want := (a - b) / (2 * h)
			if math.Abs(grad[i]) > 1e3 { // curvature then spoils the difference
				t.Skip("too steep")
			}
			if math.Abs(grad[i]-want) > 1e-4*(1+math.Abs(grad[i])) {
				t.Fatalf("d/d%d = %v, by differences %v", i, grad[i], want)
			}
		}
	})
}
