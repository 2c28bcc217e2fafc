package main

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// A fence is one fenced block of a Markdown text.
type fence struct {
	line  int    // of its opening, from 1
	kind  string // the word behind the opening
	named string // what an HTML comment on the line before it says
	body  []string
}

var fenceName = regexp.MustCompile(`^<!--\s*(\S+\.bias)\s*-->$`)

func fences(text string) ([]fence, error) {
	var all []fence
	var open *fence
	before := ""
	for i, line := range strings.Split(text, "\n") {
		switch {
		case open != nil && strings.HasPrefix(line, "```"):
			all = append(all, *open)
			open = nil
		case open != nil:
			open.body = append(open.body, line)
		case strings.HasPrefix(line, "```"):
			open = &fence{line: i + 1, kind: strings.TrimPrefix(line, "```")}
			if m := fenceName.FindStringSubmatch(before); m != nil {
				open.named = m[1]
			}
		}
		if strings.TrimSpace(line) != "" {
			before = strings.TrimSpace(line)
		}
	}
	if open != nil {
		return nil, fmt.Errorf("the fence of line %d is not closed", open.line)
	}
	return all, nil
}

// TestREADME runs what README shows. In a block fenced as console each line that
// begins with "$ " is a command, and the lines up to the next are what it prints,
// standard output first; a last line of "…" stands for what is not shown. A block fenced as bias must parse; where a comment on
// the line before names a file, as in <!-- sink.bias -->, the file is there for
// the commands.
func TestREADME(t *testing.T) {
	root := filepath.Join(packageDir, "..", "..")
	text, err := os.ReadFile(filepath.Join(root, "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	all, err := fences(string(text))
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	circuits := filepath.Join("testdata", "circuits")
	if err := os.CopyFS(filepath.Join(dir, circuits), os.DirFS(filepath.Join(root, circuits))); err != nil {
		t.Fatal(err)
	}
	commands := 0
	for _, f := range all {
		switch f.kind {
		case "bias":
			parses(t, dir, f)
		case "console":
			commands += runs(t, dir, f)
		}
	}
	if commands == 0 {
		t.Error("README shows no command")
	}
}

// A picture of README stands below a comment with the command that drew it.
var pictured = regexp.MustCompile(`(?m)^<!-- (biaswright .* --chart (\S+)) -->\n!\[[^\]]+\]\((\S+)\)$`)

// TestPictures draws README's pictures again: they are what the command draws today.
func TestPictures(t *testing.T) {
	root := filepath.Join(packageDir, "..", "..")
	text, err := os.ReadFile(filepath.Join(root, "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	for _, folder := range []string{"circuits", "pictures"} {
		if err := os.CopyFS(filepath.Join(dir, "testdata", folder), os.DirFS(filepath.Join(root, "testdata", folder))); err != nil {
			t.Fatal(err)
		}
	}
	found := pictured.FindAllStringSubmatch(string(text), -1)
	if want := strings.Count(string(text), "!["); len(found) != want || want == 0 {
		t.Fatalf("%d of %d pictures stand below the command that drew them", len(found), want)
	}
	for _, match := range found {
		command, drawn, shown := match[1], match[2], match[3]
		if drawn != shown {
			t.Errorf("%s is shown, and %s drawn", shown, drawn)
		}
		want, err := os.ReadFile(filepath.Join(dir, shown))
		if err != nil {
			t.Fatal(err)
		}
		if said, err := run(dir, command); err != nil {
			t.Fatalf("%v\n%s", err, said)
		}
		got, err := os.ReadFile(filepath.Join(dir, drawn))
		if err != nil {
			t.Fatal(err)
		}
		if err := alike(string(got), string(want)); err != nil {
			t.Errorf("%s: %v", shown, err)
		}
	}
}

// parses checks a bias block, and makes its file where it is named.
func parses(t *testing.T, dir string, f fence) {
	t.Helper()
	text := strings.Join(f.body, "\n") + "\n"
	cmd := exec.Command("biaswright", "tidy", "-")
	cmd.Stdin = strings.NewReader(text)
	if out, err := cmd.CombinedOutput(); err != nil {
		t.Errorf("README line %d: %v\n%s", f.line, err, out)
	}
	if f.named == "" {
		return
	}
	if err := os.WriteFile(filepath.Join(dir, f.named), []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

// runs runs the commands of a console block and returns how many there are.
func runs(t *testing.T, dir string, f fence) int {
	t.Helper()
	count := 0
	for i := 0; i < len(f.body); {
		line := f.line + i + 1
		command, ok := strings.CutPrefix(f.body[i], "$ ")
		if !ok {
			t.Errorf("README line %d: no command before this output", line)
			return count
		}
		i++
		var want []string
		for i < len(f.body) && !strings.HasPrefix(f.body[i], "$ ") {
			want = append(want, f.body[i])
			i++
		}
		count++
		got, err := run(dir, command)
		if err != nil {
			t.Errorf("README line %d: %v", line, err)
			continue
		}
		got, want = shown(got, want)
		if err := alike(strings.TrimRight(got, "\n"), strings.TrimRight(strings.Join(want, "\n"), "\n")); err != nil {
			t.Errorf("README line %d: %v\nall of it:\n%s", line, err, got)
		}
	}
	return count
}

// shown cuts what was printed where README shows only its beginning: there the block
// ends with a line of "…".
func shown(got string, want []string) (string, []string) {
	last := len(want) - 1
	if last < 0 || want[last] != "…" {
		return got, want
	}
	lines := strings.Split(got, "\n")
	return strings.Join(lines[:min(last, len(lines))], "\n"), want[:last]
}

// run runs a command line of README, which a reader would type in a clone, and
// returns what it prints. A code other than 0 is no error: README shows those
// too, by what they say.
func run(dir, command string) (string, error) {
	words := split(command)
	switch {
	case strings.HasPrefix(command, "go build ") || strings.HasPrefix(command, "go install "):
		return "", nil // this test's own binary stands for what they make
	case strings.HasPrefix(command, "go run ./cmd/biaswright"):
		words = words[2:]
	case len(words) == 0 || (words[0] != "biaswright" && words[0] != "./biaswright"):
		return "", fmt.Errorf("%q is no command that this test runs", command)
	}
	cmd := exec.Command("biaswright", words[1:]...)
	cmd.Dir = dir
	var out, errs strings.Builder
	cmd.Stdout, cmd.Stderr = &out, &errs
	err := cmd.Run()
	if cmd.ProcessState == nil || cmd.ProcessState.ExitCode() < 0 {
		return "", err
	}
	return out.String() + errs.String(), nil
}

// split cuts a command line at spaces outside quotes.
func split(line string) []string {
	var words []string
	word, quote, open := "", rune(0), false
	for _, r := range line {
		switch {
		case quote != 0 && r == quote:
			quote = 0
		case quote == 0 && (r == '\'' || r == '"'):
			quote, open = r, true
		case quote == 0 && r == ' ':
			if open || word != "" {
				words = append(words, word)
			}
			word, open = "", false
		default:
			word += string(r)
		}
	}
	if open || word != "" {
		words = append(words, word)
	}
	return words
}
