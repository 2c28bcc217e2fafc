package main

import (
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"testing"
)

// BenchmarkChartCommand prints what a chart adds to the whole command, process and all:
// compare each line with its plain one.
func BenchmarkChartCommand(b *testing.B) {
	binary := build(b)
	file := "../../testdata/circuits/mast-lamp.bias"
	out := b.TempDir()
	for _, one := range []struct {
		name string
		args []string
	}{
		{"solve", []string{"solve", file}},
		{"sweep", []string{"sweep", file, "--over", "RE=43,47,51", "--over", "VCC=0V..24V"}},
		{"limits", []string{"limits", file}},
		{"limits of a bank", []string{"limits", "../../testdata/circuits/sensor-bank.bias"}}, // the largest sheet that ships
	} {
		for _, chart := range []string{"plain", "chart.svg", "chart.png"} {
			args := one.args
			if chart != "plain" {
				args = append(append([]string(nil), args...), "--chart", filepath.Join(out, chart))
			}
			b.Run(one.name+"/"+chart, func(b *testing.B) {
				for b.Loop() {
					// A demo that does not meet all that is asked exits with 1.
					if err := exec.Command(binary, args...).Run(); err != nil {
						if exit, ok := err.(*exec.ExitError); !ok || exit.ExitCode() > 1 {
							b.Fatal(err)
						}
					}
				}
			})
		}
	}
}

// BenchmarkChartSize prints how much of the program charts are, in bytes, with what a
// debugger needs and without it: the program is built as it is, and with
// testdata/nochart.go in the place of the file that asks for charts.
func BenchmarkChartSize(b *testing.B) {
	file, err := filepath.Abs("internal/cli/chart.go")
	if err != nil {
		b.Fatal(err)
	}
	stub, err := filepath.Abs("testdata/nochart.go")
	if err != nil {
		b.Fatal(err)
	}
	overlay, err := json.Marshal(map[string]any{"Replace": map[string]string{file: stub}})
	if err != nil {
		b.Fatal(err)
	}
	name := filepath.Join(b.TempDir(), "overlay.json")
	if err := os.WriteFile(name, overlay, 0o600); err != nil {
		b.Fatal(err)
	}
	const stripped = "-s -w"
	debug := size(b, build(b)) - size(b, build(b, "-overlay", name))
	plain := size(b, build(b, "-ldflags", stripped)) - size(b, build(b, "-ldflags", stripped, "-overlay", name))
	for b.Loop() { // there is nothing to repeat
		b.ReportMetric(float64(plain), "chart-bytes")
		b.ReportMetric(float64(debug), "with-debug-bytes")
	}
	b.ReportMetric(0, "ns/op")
}

func build(b *testing.B, options ...string) string {
	b.Helper()
	out := filepath.Join(b.TempDir(), "biaswright")
	args := append([]string{"build", "-o", out}, options...)
	if said, err := exec.Command("go", append(args, ".")...).CombinedOutput(); err != nil {
		b.Fatalf("%v\n%s", err, said)
	}
	return out
}

func size(b *testing.B, name string) int64 {
	b.Helper()
	info, err := os.Stat(name)
	if err != nil {
		b.Fatal(err)
	}
	return info.Size()
}
