package main

import (
	"go/parser"
	"go/token"
	"io/fs"
	"maps"
	"path"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

const (
	root   = "../.." // of the module, from this package
	module = "biaswright"
)

// layers is the direction of imports: a package imports from its own layer or
// from one before it, never from one after.
var layers = []string{"netlist", "devices", "solve", "sweep", "cmd"}

// A row says what a package may import of this module: in its code, and in its
// tests besides. Own sub-packages are named like any other.
type row struct{ code, tests string }

// rules is the table of who may import whom. A package without a row fails, so
// that each new one states its place.
var rules = map[string]row{
	"netlist/diag":     {},
	"netlist/quantity": {},
	"netlist/syntax":   {code: "netlist/diag netlist/quantity", tests: "netlist/internal/expect"},
	"netlist":          {code: "netlist/diag netlist/quantity netlist/syntax", tests: "netlist/internal/expect"},

	"netlist/internal/expect": {code: "netlist/diag"},

	"devices/physics": {},
	"devices/shelf":   {tests: "netlist netlist/diag netlist/quantity netlist/syntax devices"},
	"devices":         {code: "netlist netlist/quantity devices/physics", tests: "devices/conform netlist/diag"},
	"devices/conform": {code: "netlist netlist/quantity devices"},

	// The numeric kernels know no circuits.
	"solve/twofold": {},
	"solve/sparse":  {code: "solve/twofold"},
	"solve/newton":  {code: "solve/sparse"},
	"solve/follow":  {code: "solve/newton solve/sparse"},

	"solve/interval": {},
	"solve/every":    {code: "solve/interval"},

	"solve/mna": {
		code:  "netlist netlist/quantity devices devices/physics solve/sparse solve/newton solve/twofold solve/every solve/interval",
		tests: "devices/shelf",
	},
	"solve": {
		code:  "netlist netlist/quantity devices solve/mna solve/newton solve/follow solve/sparse solve/every solve/interval",
		tests: "netlist/diag devices/shelf solve/reftest",
	},
	"solve/reftest": {tests: "netlist netlist/diag devices devices/physics devices/shelf solve solve/mna solve/every solve/interval"},

	"sweep": {
		code:  "netlist netlist/diag netlist/quantity solve solve/mna solve/newton",
		tests: "devices solve/reftest",
	},
	"sweep/limits": {
		code:  "netlist netlist/quantity devices solve solve/mna solve/newton solve/follow sweep",
		tests: "devices devices/shelf solve/reftest",
	},
	"sweep/choose": {
		code:  "netlist netlist/diag netlist/quantity netlist/syntax solve solve/mna solve/newton",
		tests: "devices devices/shelf",
	},
	"sweep/hand": {
		code:  "netlist netlist/diag devices solve solve/mna solve/newton",
		tests: "solve/reftest devices/shelf",
	},

	"sweep/compare": {
		code:  "netlist netlist/quantity solve sweep/limits",
		tests: "devices sweep",
	},

	"cmd/biaswright": {code: "cmd/biaswright/internal/cli"},
	"cmd/biaswright/internal/cli": {
		code: "netlist netlist/diag netlist/quantity netlist/syntax devices devices/shelf solve sweep sweep/limits sweep/choose sweep/hand sweep/compare cmd/biaswright/internal/render cmd/biaswright/internal/chart cmd/biaswright/internal/figure",
	},
	"cmd/biaswright/internal/figure": {},
	"cmd/biaswright/internal/chart": {
		code:  "netlist netlist/quantity solve sweep sweep/limits sweep/choose sweep/compare sweep/hand cmd/biaswright/internal/figure cmd/biaswright/internal/render",
		tests: "devices devices/shelf netlist/diag sweep/hand",
	},
	"cmd/biaswright/internal/render": {
		code:  "netlist netlist/diag netlist/quantity devices solve solve/interval sweep sweep/limits sweep/choose sweep/hand sweep/compare",
		tests: "netlist/syntax devices/shelf",
	},
}

// harnesses are packages that exist for tests: only they, and test files, import
// the libraries of testsOnly; and no code imports them.
var (
	harnesses = []string{"netlist/internal/expect", "devices/conform", "solve/reftest"}
	testsOnly = []string{
		"testing", "pgregory.net/rapid", "github.com/google/go-cmp", "github.com/cockroachdb/apd/v3",
		"github.com/rogpeppe/go-internal",
	}
)

// imported has the import paths of a package: code, then tests.
type imported struct{ code, tests []string }

func TestImportsFollowTheTable(t *testing.T) {
	packages := modulePackages(t)
	for _, name := range slices.Sorted(maps.Keys(packages)) {
		rule, ok := rules[name]
		if !ok {
			t.Errorf("package %s has no row in the table of imports", name)
			continue
		}
		code, tests := strings.Fields(rule.code), strings.Fields(rule.tests)
		for _, p := range packages[name].code {
			if own, ok := ours(p); ok && !slices.Contains(code, own) {
				t.Errorf("%s imports %s: not in its row", name, own)
			}
			if slices.ContainsFunc(testsOnly, func(lib string) bool { return covers(lib, p) }) && !slices.Contains(harnesses, name) {
				t.Errorf("%s imports %s outside its tests", name, p)
			}
		}
		for _, p := range packages[name].tests {
			own, ok := ours(p)
			if ok && own != name && !slices.Contains(code, own) && !slices.Contains(tests, own) {
				t.Errorf("a test of %s imports %s: not in its row", name, own)
			}
		}
	}
	for name := range rules {
		if _, ok := packages[name]; !ok {
			t.Errorf("the table of imports has a row for %s, which does not exist", name)
		}
	}
}

func TestImportsTableHasOneDirection(t *testing.T) {
	layer := func(name string) int {
		top, _, _ := strings.Cut(name, "/")
		return slices.Index(layers, top)
	}
	for name, rule := range rules {
		if layer(name) < 0 {
			t.Errorf("%s stands in no layer of %v", name, layers)
		}
		for _, p := range strings.Fields(rule.code) {
			if layer(p) > layer(name) {
				t.Errorf("the table lets %s import %s, against the direction", name, p)
			}
			if slices.Contains(harnesses, p) {
				t.Errorf("the table lets %s import %s, which exists for tests", name, p)
			}
			if _, ok := rules[p]; !ok {
				t.Errorf("the row of %s names %s, which has none", name, p)
			}
		}
	}
}

// modulePackages reads the import clauses of every Go file of the module.
func modulePackages(t *testing.T) map[string]imported {
	t.Helper()
	packages := map[string]imported{}
	err := filepath.WalkDir(root, func(file string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		base := d.Name()
		if d.IsDir() {
			// The go command passes over these as well.
			if file != root && (strings.HasPrefix(base, ".") || strings.HasPrefix(base, "_") || base == "testdata") {
				return fs.SkipDir
			}
			return nil
		}
		if !strings.HasSuffix(base, ".go") {
			return nil
		}
		syntax, err := parser.ParseFile(token.NewFileSet(), file, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		dir, err := filepath.Rel(root, filepath.Dir(file))
		if err != nil {
			return err
		}
		name := filepath.ToSlash(dir)
		p := packages[name]
		for _, spec := range syntax.Imports {
			target, err := strconv.Unquote(spec.Path.Value)
			if err != nil {
				return err
			}
			if strings.HasSuffix(base, "_test.go") {
				p.tests = append(p.tests, target)
			} else {
				p.code = append(p.code, target)
			}
		}
		packages[name] = p
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if len(packages) == 0 {
		t.Fatal("no package found")
	}
	return packages
}

// ours gives an import path relative to the module.
func ours(p string) (string, bool) {
	if p == module {
		return ".", true
	}
	return strings.CutPrefix(p, module+"/")
}

// covers tells whether p is the package lib or stands below it.
func covers(lib, p string) bool { return p == lib || strings.HasPrefix(path.Clean(p), lib+"/") }
