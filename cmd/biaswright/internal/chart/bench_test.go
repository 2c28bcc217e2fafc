package chart_test

import (
	"bytes"
	"os"
	"testing"

	"biaswright/cmd/biaswright/internal/chart"
	"biaswright/cmd/biaswright/internal/figure"
	"biaswright/cmd/biaswright/internal/render"
	"biaswright/devices"
	"biaswright/devices/shelf"
	"biaswright/netlist"
	"biaswright/solve"
	"biaswright/sweep/limits"
)

func circuit(t testing.TB, text string) *netlist.Circuit {
	t.Helper()
	c, list := netlist.Read("test.bias", []byte(text), devices.Catalogue(), netlist.Files{Shelves: shelf.All()})
	if list.HasErrors() {
		t.Fatalf("%v\n%s", list, text)
	}
	return c
}

func demo(t testing.TB, name string) *netlist.Circuit {
	t.Helper()
	text, err := os.ReadFile("../../../../testdata/circuits/" + name + ".bias")
	if err != nil {
		t.Fatal(err)
	}
	return circuit(t, string(text))
}

func solved(t testing.TB, c *netlist.Circuit) *render.Answer {
	t.Helper()
	res, err := solve.Solve(c, solve.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return &render.Answer{File: "test.bias", Circuit: c, Result: res}
}

func limitsOf(t testing.TB, c *netlist.Circuit) *render.LimitsAnswer {
	t.Helper()
	found, err := limits.Find(c, limits.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return &render.LimitsAnswer{File: "test.bias", Circuit: c, Limits: found}
}

// BenchmarkChart prints what a chart adds to a command: to draw it, and to write it in
// either form. The fonts are parsed in the first round alone; a command pays for that
// once more (BenchmarkFonts).
func BenchmarkChart(b *testing.B) {
	a, l := solved(b, demo(b, "mast-lamp")), limitsOf(b, demo(b, "mast-lamp"))
	for _, one := range []struct {
		name string
		draw func() *figure.Figure
	}{
		{"headroom", func() *figure.Figure { return chart.Headroom(a) }},
		{"limits", func() *figure.Figure {
			f, err := chart.Limits(l)
			if err != nil {
				b.Fatal(err)
			}
			return f
		}},
	} {
		f := one.draw()
		b.Run(one.name+"/draw", func(b *testing.B) {
			for b.Loop() {
				one.draw()
			}
		})
		b.Run(one.name+"/svg", func(b *testing.B) {
			for b.Loop() {
				var out bytes.Buffer
				if err := figure.WriteSVG(&out, f); err != nil {
					b.Fatal(err)
				}
			}
		})
		b.Run(one.name+"/png", func(b *testing.B) {
			for b.Loop() {
				var out bytes.Buffer
				if err := figure.WritePNG(&out, f); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
