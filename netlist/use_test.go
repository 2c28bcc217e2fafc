package netlist

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"biaswright/netlist/syntax"
)

var testShelves = map[string][]byte{
	"generic": []byte("given VRED = 1.8 V\npart red led drop = VRED at 10 mA, n = 2\npart small diode drop = 0.6 V at 1 mA\n"),
}

// memory is a source of texts by name.
type memory map[string]string

func (m memory) Open(from, path string) (name string, text []byte, err error) {
	t, ok := m[path]
	if !ok {
		return path, nil, errors.New("no such file")
	}
	return path, []byte(t), nil
}

func (m memory) Shelf(name string) ([]byte, bool) { t, ok := testShelves[name]; return t, ok }

func TestUse(t *testing.T) {
	src := memory{
		"parts.bias":  "use \"base.bias\"\ngiven VD = 0.7 V\npart gp npn Vbe = VD at 1 mA\npart sig diode n = 1.5\nrail VX = 5 V\n",
		"base.bias":   "part lamp led drop = 2 V at 1 mA\ngiven RX = 470 ohm\n",
		"other.bias":  "use \"base.bias\"\npart sig diode n = 1.2\n",
		"loop.bias":   "use \"back.bias\"\n",
		"back.bias":   "use \"loop.bias\"\n",
		"broken.bias": "part sig diode n = = 2\n",
		"wrong.bias":  "part sig diode n = 3 V\n",
		"main.bias":   "",
	}
	const circuit = "rail VCC = 5 V\npath VCC -> R1 RX -> a -> D1 sig -> b -> D2 lamp -> gnd\n"
	c, diags := Read("main.bias", []byte("use \"parts.bias\"\n"+circuit), testCatalogue(), src)
	if c == nil || len(diags) != 0 {
		t.Fatalf("%v", diags)
	}
	if number(t, c, "R1") != 470 || number(t, c, "D1.n") != 1.5 || number(t, c, "D2.drop") != 2 || number(t, c, "sig.n") != 1.5 {
		t.Error("the values of the parts that were taken in")
	}
	if len(c.Parts) != 3 || !c.Parts[0].Shelf {
		t.Errorf("the parts that were taken in are there to choose from: %+v", c.Parts)
	}
	c, diags = Read("main.bias", []byte("use \"parts.bias\"\npart sig diode n = 1.1\n"+circuit), testCatalogue(), src)
	if c == nil || number(t, c, "D1.n") != 1.1 {
		t.Errorf("a local part wins: %v", diags)
	}
	c, diags = Read("main.bias", []byte("use generic\nrail VCC = 5 V\ngiven VRED = 3 V\npath VCC -> R1 1k -> a -> D1 red -> b -> D2 drop VRED -> gnd\n"), testCatalogue(), src)
	if c == nil || number(t, c, "D1.drop") != 1.8 || number(t, c, "VRED") != 3 {
		t.Errorf("each text has its own names: %v", diags)
	}
	for text, want := range map[string]string{
		"use \"loop.bias\"\n":                      "the files use each other in a circle: loop.bias -> back.bias -> loop.bias",
		"use \"main.bias\"\n":                      "the files use each other in a circle: main.bias -> main.bias",
		"use \"none.bias\"\n":                      "none.bias cannot be read: no such file",
		"use special\n":                            "there is no shelf called special",
		"use \"parts.bias\"\nuse \"other.bias\"\n": "sig comes from both parts.bias and other.bias",
		"use \"wrong.bias\"\nuse \"base.bias\"\n":  "n of sig is a plain number, but is given in volts",
	} {
		c, diags := Read("main.bias", []byte(text+circuit), testCatalogue(), src)
		found := false
		for _, d := range diags {
			found = found || d.Message == want
		}
		if c != nil || !found {
			t.Errorf("%q: %v, want %q", text, diags, want)
		}
	}
	if _, diags := Read("main.bias", []byte("use \"none.bias\"\n"+circuit), testCatalogue(), src); len(diags) != 1 {
		t.Errorf("names that a text would have brought in are not unknown: %v", diags)
	}
	if c, diags := Read("main.bias", []byte("use \"broken.bias\"\n"+circuit), testCatalogue(), src); c != nil || diags[0].Span.File != "broken.bias" && diags[len(diags)-1].Span.File != "broken.bias" {
		t.Errorf("the errors of a text that is taken in have their places there: %v", diags)
	}
}

func TestFiles(t *testing.T) {
	dir := t.TempDir()
	write := func(name, text string) string {
		path := filepath.Join(dir, name)
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		return path
	}
	write("lib/parts.bias", "use \"more/base.bias\"\n")
	write("lib/more/base.bias", "part sig diode\n")
	write("lib/big.bias", strings.Repeat("#", syntax.MaxSize+1))
	main := write("main.bias", "")
	text := "rail VCC = 5 V\npath VCC -> R1 1k -> a -> D1 sig -> gnd\n"
	if c, diags := Read(main, []byte("use \"lib/parts.bias\"\n"+text), testCatalogue(), Files{}); c == nil {
		t.Errorf("paths are relative to the file that names them: %v", diags)
	}
	_, diags := Read(main, []byte("use \"lib/big.bias\"\n"+text), testCatalogue(), Files{})
	if len(diags) == 0 || !strings.Contains(diags[0].Message, "longer than") {
		t.Errorf("a text that is too long: %v", diags)
	}
	_, diags = Read(main, []byte("use \"lib\"\n"+text), testCatalogue(), Files{})
	if len(diags) == 0 || !strings.Contains(diags[0].Message, "lib cannot be read") {
		t.Errorf("a folder: %v", diags)
	}
}

func TestReadParts(t *testing.T) {
	c, diags := ReadParts("generic", testShelves["generic"], testCatalogue(), nil)
	if c == nil || len(diags) != 0 || len(c.Parts) != 2 || len(c.Givens) != 1 || number(t, c, "red.drop") != 1.8 {
		t.Errorf("%+v %v", c, diags)
	}
}
