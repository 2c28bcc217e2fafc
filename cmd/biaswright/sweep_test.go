package main

import (
	"bufio"
	"bytes"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
	"time"
)

// circuit is the path of a shipped circuit.
func circuit(tb testing.TB, name string) string {
	tb.Helper()
	path, err := filepath.Abs(filepath.Join("..", "..", "testdata", "circuits", name))
	if err != nil {
		tb.Fatal(err)
	}
	return path
}

// installed is the command as the tests run it.
func installed(t *testing.T) string {
	t.Helper()
	path, err := exec.LookPath("biaswright")
	if err != nil {
		t.Fatal(err)
	}
	return path
}

// program builds the command as it is shipped.
func program(tb testing.TB) string {
	tb.Helper()
	path := filepath.Join(tb.TempDir(), "biaswright")
	if out, err := exec.Command("go", "build", "-tags", "urfave_cli_no_docs", "-o", path, ".").CombinedOutput(); err != nil {
		tb.Fatalf("%v\n%s", err, out)
	}
	return path
}

// Readers in common use take the CSV as it is, where they are installed.
func TestCSVReaders(t *testing.T) {
	for _, reader := range []struct {
		name, probe string
		command     func(file string) []string
	}{
		{"pandas", "python3 -c 'import pandas'", func(file string) []string {
			return []string{"python3", "-c", "import pandas,sys; d=pandas.read_csv(sys.argv[1]); assert list(d.columns)==['VCC.V [V]','LAMP.I [A]','status'], d.columns; assert len(d)==5 and d['LAMP.I [A]'].dtype=='float64'", file}
		}},
		{"gnuplot", "gnuplot --version", func(file string) []string {
			return []string{"gnuplot", "-e", "set datafile separator ','; stats '" + file + "' using 1:2 nooutput; if (STATS_records != 5) exit error 'records'"}
		}},
	} {
		t.Run(reader.name, func(t *testing.T) {
			if exec.Command("sh", "-c", reader.probe).Run() != nil {
				t.Skipf("%s is not installed", reader.name)
			}
			bin := installed(t)
			csv, err := exec.Command(bin, "sweep", circuit(t, "mast-lamp.bias"), "--over", "VCC=11V..13V", "--points", "5", "--csv").Output()
			if err != nil {
				t.Fatal(err)
			}
			file := filepath.Join(t.TempDir(), "sweep.csv")
			if err := os.WriteFile(file, csv, 0o600); err != nil {
				t.Fatal(err)
			}
			args := reader.command(file)
			if out, err := exec.Command(args[0], args[1:]...).CombinedOutput(); err != nil {
				t.Errorf("%v\n%s", err, out)
			}
		})
	}
}

// A reader that leaves early ends a sweep quietly.
func TestSweepIntoAShortReader(t *testing.T) {
	if _, err := exec.LookPath("head"); err != nil {
		t.Skip("there is no head")
	}
	bin := installed(t)
	cmd := exec.Command("sh", "-c", `"$0" sweep "$1" --over VCC=3V..15V --points 200000 --csv | head -n 3`, bin, circuit(t, "mast-lamp.bias"))
	var errs bytes.Buffer
	cmd.Stderr = &errs
	out, err := cmd.Output()
	if err != nil || errs.Len() > 0 || strings.Count(string(out), "\n") != 3 {
		t.Errorf("%v; standard error %q; output %q", err, errs.String(), out)
	}
}

// An interrupted sweep ends at once with 130, and leaves whole rows only.
func TestInterruptedSweepLeavesWholeRows(t *testing.T) {
	if runtime.GOOS == "windows" {
		t.Skip("there is no interrupt to send")
	}
	cmd := exec.Command(installed(t), "sweep", circuit(t, "mast-lamp.bias"), "--over", "VCC=3V..15V", "--points", "9000000", "--csv")
	out, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	r := bufio.NewReader(out)
	for range 1000 { // well on its way
		if _, err := r.ReadString('\n'); err != nil {
			t.Fatal(err)
		}
	}
	if err := cmd.Process.Signal(os.Interrupt); err != nil {
		t.Fatal(err)
	}
	rest, err := io.ReadAll(r)
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Wait(); cmd.ProcessState.ExitCode() != 130 {
		t.Errorf("%v, exit code %d", err, cmd.ProcessState.ExitCode())
	}
	lines := strings.SplitAfter(string(rest), "\n")
	for _, line := range lines[:len(lines)-1] {
		if strings.Count(line, ",") != 2 || !strings.HasSuffix(line, ",ok\n") {
			t.Fatalf("a part of a row: %q", line)
		}
	}
	if last := lines[len(lines)-1]; last != "" {
		t.Errorf("the last row is cut: %q", last)
	}
}

// BenchmarkWholeCommand prints what a sweep of 10 000 points as CSV and a solve of
// the two-diode sink cost beyond a command that does nothing, process and all,
// run in turns.
func BenchmarkWholeCommand(b *testing.B) {
	bin := program(b)
	w1 := circuit(b, "w1.bias")
	commands := [][]string{
		{"version"},
		{"solve", w1},
		{"sweep", w1, "--over", "VCC=6V..18V", "--points", "10000", "--csv", "--show", "LAMP.I"},
	}
	var spent [3]time.Duration
	for b.Loop() {
		for i, args := range commands {
			start := time.Now()
			if out, err := exec.Command(bin, args...).Output(); err != nil {
				b.Fatalf("%v: %v\n%s", args, err, out)
			}
			spent[i] += time.Since(start)
		}
	}
	ms := func(d time.Duration) float64 { return d.Seconds() * 1e3 / float64(b.N) }
	b.ReportMetric(ms(spent[0]), "ms-nothing")
	b.ReportMetric(ms(spent[1]-spent[0]), "ms-solve-beyond")
	b.ReportMetric(ms(spent[2]-spent[0]), "ms-sweep-beyond")
}
