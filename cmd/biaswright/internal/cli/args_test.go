package cli

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func TestArrangePutsOptionsBeforeFiles(t *testing.T) {
	takes := map[string]bool{"set": true, "near": true}
	for _, c := range []struct {
		name     string
		in, want []string
	}{
		{"nothing", nil, nil},
		{"options behind", []string{"solve", "a", "--json"}, []string{"solve", "--json", "--", "a"}},
		{"options between", []string{"solve", "a", "--set", "V=1", "b"}, []string{"solve", "--set", "V=1", "--", "a", "b"}},
		{"options before the command", []string{"--json", "solve", "a"}, []string{"solve", "--json", "--", "a"}},
		{"a value in one word", []string{"solve", "a", "--set=V=1"}, []string{"solve", "--set=V=1", "--", "a"}},
		{"a value that looks like an option", []string{"solve", "--set", "-x", "a"}, []string{"solve", "--set", "-x", "--", "a"}},
		{"standard input", []string{"solve", "-", "--json"}, []string{"solve", "--json", "--", "-"}},
		{"files behind a double dash", []string{"solve", "--json", "--", "--set"}, []string{"solve", "--json", "--", "--set"}},
		{"help", []string{"help", "solve"}, []string{"solve", "--help"}},
		{"help alone", []string{"help"}, []string{"--help"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			got, err := arrange(append([]string{"biaswright"}, c.in...), takes)
			if err != nil {
				t.Fatal(err)
			}
			if d := cmp.Diff(append([]string{"biaswright"}, c.want...), got); d != "" {
				t.Error(d)
			}
		})
	}
	if _, err := arrange([]string{"biaswright", "solve", "a", "--near"}, takes); err == nil {
		t.Error("an option without its value passes")
	}
}

// tidy's --write is a switch, choose's has a value.
func TestValuedOptionsAreTheCommandsOwn(t *testing.T) {
	r := &runner{}
	for args, want := range map[string][]string{
		"tidy --write a":       {"tidy", "--write", "--", "a"},
		"--write tidy a":       {"tidy", "--write", "--", "a"},
		"choose a --write b":   {"choose", "--write", "b", "--", "a"},
		"choose --write b a":   {"choose", "--write", "b", "--", "a"},
		"tidy --write -- list": {"tidy", "--write", "--", "list"},
	} {
		in := append([]string{"biaswright"}, strings.Fields(args)...)
		got, err := arrange(in, valued(r.app(), commandIn(r.app(), in[1:])))
		if err != nil {
			t.Fatal(err)
		}
		if d := cmp.Diff(append([]string{"biaswright"}, want...), got); d != "" {
			t.Errorf("%s: %s", args, d)
		}
	}
}

// Every option that the commands declare is known to arrange.
func TestValuedOptions(t *testing.T) {
	r := &runner{}
	got := valued(r.app(), "")
	if d := cmp.Diff(map[string]bool{
		"set": true, "at": true,
		"budget": true,
		"chart":  true, "near": true, "within": true, "workers": true,
		"over": true, "points": true, "log": true, "show": true,
		"reopen": true, "list": true, "write": true,
	}, got); d != "" {
		t.Error(d)
	}
}
