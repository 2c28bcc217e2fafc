package main

import (
	"encoding/json"
	"errors"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/google/jsonschema-go/jsonschema"
	"github.com/rogpeppe/go-internal/testscript"
)

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"biaswright": main})
}

// TestScripts runs testdata/script. Beside testscript's own commands the scripts
// know:
//
//	exits CODE COMMAND...   run, and require that exit code
//	silent stdout|stderr    that stream of the last command holds nothing
//	screen FILE             standard output is FILE, numbers within a tolerance
//	fits SCHEMA             standard output is JSON that keeps to the schema
//	big FILE MEBIBYTES      make a file of comment lines
//	zeros FILE              make a file of zero bytes
//	interrupts COMMAND...   start, interrupt, and require exit code 130
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:                 filepath.Join("..", "..", "testdata", "script"),
		RequireExplicitExec: true,
		Setup: func(e *testscript.Env) error {
			root, err := filepath.Abs(filepath.Join("..", ".."))
			e.Setenv("CIRCUITS", filepath.Join(root, "testdata", "circuits"))
			return err
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"exits":      exits,
			"silent":     silent,
			"screen":     screen,
			"fits":       fits,
			"big":        big,
			"zeros":      zeros,
			"interrupts": interrupts,
		},
	})
}

func exits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: exits CODE COMMAND...")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	got := 0
	if err := ts.Exec(args[1], args[2:]...); err != nil {
		var exit *exec.ExitError
		if !errors.As(err, &exit) {
			ts.Fatalf("%v", err)
		}
		got = exit.ExitCode()
	}
	if got != want {
		ts.Fatalf("exit code %d, want %d", got, want)
	}
}

func silent(ts *testscript.TestScript, neg bool, args []string) {
	if len(args) != 1 || (args[0] != "stdout" && args[0] != "stderr") {
		ts.Fatalf("usage: [!] silent stdout|stderr")
	}
	if empty := ts.ReadFile(args[0]) == ""; empty == neg {
		ts.Fatalf("%s: silent is %v", args[0], empty)
	}
}

func screen(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: screen FILE")
	}
	got := ts.ReadFile("stdout")
	if err := alike(got, ts.ReadFile(args[0])); err != nil {
		ts.Fatalf("%v; it is\n%s", err, got)
	}
}

func fits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: fits SCHEMA")
	}
	text, err := os.ReadFile(schemaFile(args[0]))
	ts.Check(err)
	var s jsonschema.Schema
	ts.Check(json.Unmarshal(text, &s))
	resolved, err := s.Resolve(nil)
	ts.Check(err)
	var v any
	ts.Check(json.Unmarshal([]byte(ts.ReadFile("stdout")), &v))
	several, ok := v.([]any)
	if !ok {
		several = []any{v}
	}
	for _, v := range several {
		ts.Check(resolved.Validate(v))
	}
}

// schemaFile is where a schema is kept; its path is found from this package,
// which is the test's working folder, whatever folder a script is in.
func schemaFile(name string) string {
	return filepath.Join(packageDir, "internal", "render", "schema", name+".json")
}

var packageDir = func() string {
	dir, err := os.Getwd()
	if err != nil {
		panic(err)
	}
	return dir
}()

func big(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: big FILE MEBIBYTES")
	}
	n, err := strconv.Atoi(args[1])
	ts.Check(err)
	const line = "# a tide gauge station has a long tale\n"
	f, err := os.Create(ts.MkAbs(args[0]))
	ts.Check(err)
	_, err = f.WriteString(strings.Repeat(line, n<<20/len(line)+1))
	ts.Check(err)
	ts.Check(f.Close())
}

func zeros(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: zeros FILE")
	}
	const some = 1000
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), make([]byte, some), 0o666))
}

func interrupts(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) == 0 {
		ts.Fatalf("usage: interrupts COMMAND...")
	}
	path, err := exec.LookPath(args[0])
	ts.Check(err)
	cmd := exec.Command(path, args[1:]...)
	// A pipe that stays open keeps a command that reads it waiting. What it
	// reads first shows that it has started.
	in, err := cmd.StdinPipe()
	ts.Check(err)
	ts.Check(cmd.Start())
	// The pipe's buffer is smaller than this, so that the write ends only when
	// the command reads.
	_, err = io.WriteString(in, strings.Repeat("# waiting\n", 100_000))
	ts.Check(err)
	ts.Check(cmd.Process.Signal(os.Interrupt))
	stuck := time.AfterFunc(time.Minute, func() { cmd.Process.Kill() })
	defer stuck.Stop()
	err = cmd.Wait()
	const interrupted = 130
	if code := cmd.ProcessState.ExitCode(); code != interrupted {
		ts.Fatalf("exit code %d (%v), want %d", code, err, interrupted)
	}
}

// TestInvalidCircuits runs the corpus of texts with errors: each ends with 2, says
// where its error is, and has no answer.
func TestInvalidCircuits(t *testing.T) {
	files, err := filepath.Glob(filepath.Join("..", "..", "testdata", "invalid", "*.bias"))
	if err != nil || len(files) == 0 {
		t.Fatalf("no files: %v", err)
	}
	for _, file := range files {
		t.Run(filepath.Base(file), func(t *testing.T) {
			t.Parallel()
			cmd := exec.Command("biaswright", "solve", file)
			var out, errs strings.Builder
			cmd.Stdout, cmd.Stderr = &out, &errs
			_ = cmd.Run()
			if code := cmd.ProcessState.ExitCode(); code != 2 {
				t.Errorf("exit code %d", code)
			}
			if out.Len() > 0 {
				t.Errorf("standard output has %q", out.String())
			}
			if !strings.Contains(errs.String(), " error: ") {
				t.Errorf("standard error has %q", errs.String())
			}
		})
	}
}

// A command whose reader has gone says nothing.
func TestBrokenPipeEndsQuietly(t *testing.T) {
	read, write, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	read.Close()
	self, err := exec.LookPath("biaswright")
	if err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command(self, "jsonschema", "solve")
	var said strings.Builder
	cmd.Stdout, cmd.Stderr = write, &said
	err = cmd.Run()
	write.Close()
	if err == nil {
		t.Error("a command that could not print exits 0")
	}
	if said.Len() > 0 {
		t.Errorf("it said %q", said.String())
	}
}

// A disk that is full is told, with exit code 4.
func TestFullDiskIsTold(t *testing.T) {
	full, err := os.OpenFile("/dev/full", os.O_WRONLY, 0)
	if err != nil {
		t.Skip("this system has no /dev/full")
	}
	defer full.Close()
	self, err := exec.LookPath("biaswright")
	if err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command(self, "jsonschema", "solve")
	var said strings.Builder
	cmd.Stdout, cmd.Stderr = full, &said
	_ = cmd.Run()
	if code := cmd.ProcessState.ExitCode(); code != 4 {
		t.Errorf("exit code %d", code)
	}
	if !strings.HasPrefix(said.String(), "biaswright: cannot write the answer") {
		t.Errorf("it said %q", said.String())
	}
}

func TestAlikeTellsNumbersFromText(t *testing.T) {
	for _, c := range []struct {
		got, want string
		alike     bool
	}{
		{"R1 12.00 V", "R1 12.00 V", true},
		{"R1 12.00 V", "R1 12.01 V", true},
		{"R1 12.00 V", "R1 12.03 V", false},
		{"R1 12.00 V", "R2 12.00 V", false},
		{"12.00 V", "12.00 A", false},
		{"left 1.2e-17 A", "left 3.4e-16 A", true},
		{"left 1.2e-17 A", "left 1.2e-3 A", false},
		{"-1.0", "1.0", false},
		{"1", "1\n", false},
		{"Found directly in 7 steps; left 0 A at tail.", "Found directly in 6 steps; left 1e-17 A at out.", true},
		{"Found directly in 7 steps.", "Found by supply arc in 7 steps.", false},
	} {
		if err := alike(c.got, c.want); (err == nil) != c.alike {
			t.Errorf("alike(%q, %q) = %v", c.got, c.want, err)
		}
	}
}
