package syntax

import (
	"bytes"
	"fmt"
	"reflect"
	"strings"
	"testing"

	"biaswright/netlist/quantity"
)

var literalType = reflect.TypeFor[Literal]()

func parse(t testing.TB, text string) *File {
	t.Helper()
	f, list := Parse("test.bias", []byte(text))
	if list.HasErrors() {
		t.Fatalf("%q: %v", text, list)
	}
	return f
}

func TestCanonical(t *testing.T) {
	tests := []struct{ name, in, want string }{
		{"spaces and units", "rail  VCC=12V(10.8V..13.2 V)\r\n", "rail    VCC = 12 V (10.8 V .. 13.2 V)\n"},
		{"byte order mark", "\uFEFFtitle \"x\"", "title \"x\"\n"},
		{"other signs", "path VCC → R1 68\u2126 ±5% → Q 10µA → gnd", "path VCC -> R1 68 ohm 5% -> Q 10 uA -> gnd\n"},
		{"letter codes stay", "path a->R1 4k7->R2 R22->R3 10K->b", "path a -> R1 4k7 -> R2 R22 -> R3 10K -> b\n"},
		{"statement words are names elsewhere", "path path -> load rail -> hold", "path path -> load rail -> hold\n"},
		{"blank lines", "\n\nload A\n\n\n\nload B\n\n", "load    A\n\nload    B\n"},
		{"comments", "# a\n\n#b\nload A # c\n# tail", "# a\n\n#b\nload    A  # c\n# tail\n"},
		{
			"comments in a path", "path a # one\n # two\n\n -> R1 1k -> # three\n b\n",
			"path a  # one\n     # two\n     -> R1 1k  # three\n     -> b\n",
		},
		{"joined by a comma", "part p diode n=2, # why\n Rbulk = 5 ohm", "part p diode  n = 2,  # why\n     Rbulk = 5 ohm\n"},
		{"a column of parts", "part p diode n=2\npart long npn betaF=100", "part p    diode  n = 2\npart long npn    betaF = 100\n"},
		{"brackets that matter", "given x = (1+2)*3-(4-(5-6))+2^-(3^2)+(-2)^2", "given   x = (1 + 2) * 3 - (4 - (5 - 6)) + 2^-3^2 + (-2)^2\n"},
		{"the sign of a temperature", "given x = ambient- -20degC", "given   x = ambient - -20 degC\n"},
		{"bounds behind an expression", "given x = RE (1 ohm .. 2 ohm)", "given   x = RE (1 ohm .. 2 ohm)\n"},
		{"pick and more", "path a -> R 100 5% pick 95 105 100ppm/K .25 W", ""},
		{"pick ends at another unit", "path a -> R 100 5% pick 95 105 100ppm/K 0.25W", "path a -> R 100 5% pick 95 105 100 ppm/K 0.25 W\n"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			f, list := Parse("t", []byte(test.in))
			if test.want == "" {
				if !list.HasErrors() {
					t.Error("accepted")
				}
				return
			}
			if list.HasErrors() {
				t.Fatal(list)
			}
			if got := string(Print(f)); got != test.want {
				t.Errorf("got\n%s\nwant\n%s", got, test.want)
			}
			settles(t, f)
		})
	}
}

func TestLongPathIsWrapped(t *testing.T) {
	f := parse(t, "path VCC"+strings.Repeat(" -> R1 10k 1% -> node", 20))
	for line := range strings.Lines(string(Print(f))) {
		if len(line) > pageWidth+1 {
			t.Errorf("a line of %d columns: %s", len(line), line)
		}
	}
	settles(t, f)
}

// What an element is follows from its second word, and a code keeps both readings.
func TestElements(t *testing.T) {
	tests := []struct {
		text string
		what What
		ref  string
		want *quantity.Quantity
	}{
		{"R1 1.8k", WhatValue, "", &quantity.Quantity{Value: 1800}},
		{"R1 1.8 kohm", WhatValue, "", &quantity.Quantity{Value: 1800, Unit: quantity.Ohm}},
		{"R1 R22", WhatName, "R22", &quantity.Quantity{Value: 0.22, Unit: quantity.Ohm}},
		{"I1 10 uA", WhatValue, "", &quantity.Quantity{Value: 1e-5, Unit: quantity.Ampere}},
		{"I1 -10 uA", WhatValue, "", &quantity.Quantity{Value: -1e-5, Unit: quantity.Ampere}},
		{"Q1 2N2222", WhatName, "2N2222", nil},
		{"B1 cell 1.5 V", WhatCell, "", &quantity.Quantity{Value: 1.5, Unit: quantity.Volt}},
		{"D1 drop VD", WhatDrop, "", nil},
		{"RX ? E24", WhatOpen, "", nil},
	}
	for _, test := range tests {
		e := parse(t, "path a -> "+test.text+" -> b").Statements[0].(*Path).Segments[1].Element
		if e.What != test.what || e.Ref.Text != test.ref {
			t.Errorf("%s: is %v %q", test.text, e.What, e.Ref.Text)
		}
		if test.want != nil && e.Value.Literal.Quantity != *test.want {
			t.Errorf("%s: value %v", test.text, e.Value.Literal.Quantity)
		}
	}
}

func TestSpansCountCodePoints(t *testing.T) {
	f := parse(t, "\uFEFFtitle \"Ωµ\" # x\npath a → R1 68 Ω → b\n")
	path := f.Statements[1].(*Path)
	last := path.Segments[2].Node.Span
	if last.Start.Line != 2 || last.Start.Column != 20 { // counted by hand
		t.Errorf("b begins at %v", last.Start)
	}
	if got := f.Source[last.Start.Offset:last.End.Offset]; string(got) != "b" {
		t.Errorf("its text is %q", got)
	}
}

func TestParseValue(t *testing.T) {
	tests := map[string]quantity.Quantity{
		"12 V": {Value: 12, Unit: quantity.Volt}, "-40 degC": {Value: -40, Unit: quantity.Celsius}, "9": {Value: 9},
		"47k": {Value: 47000}, "4k7": {Value: 4700, Unit: quantity.Ohm}, "R22": {Value: 0.22, Unit: quantity.Ohm},
	}
	for text, want := range tests {
		v, list := ParseValue("--set", text)
		if list.HasErrors() || v.Literal.Quantity != want {
			t.Errorf("%s: %v %v", text, v, list)
		}
	}
	v, list := ParseValue("--set", "0.66 V at 1 mA")
	if list.HasErrors() || v.At.Literal.Value != 1e-3 {
		t.Errorf("point: %v %v", v, list)
	}
	for _, text := range []string{"", "12 V 13", "1 k", "5 V\n6 V", "\x00", "#"} {
		if v, list := ParseValue("--set", text); !list.HasErrors() || v != nil {
			t.Errorf("%q is accepted as %v", text, v)
		}
	}
}

func TestParseExpr(t *testing.T) {
	x, list := ParseExpr("--show", "LAMP.1.I*2 / parallel(R1,10k)")
	if list.HasErrors() || ExprText(x) != "LAMP.1.I * 2 / parallel(R1, 10k)" {
		t.Errorf("%v %v", x, list)
	}
	if x, list := ParseExpr("--show", "LAMP.I -> x"); !list.HasErrors() || x != nil {
		t.Errorf("%v %v", x, list)
	}
}

// Texts that are none, or far too large, end in one clear error.
func TestUnreadable(t *testing.T) {
	tests := []struct {
		name string
		src  []byte
		code string
	}{
		{"zero byte", []byte("load A\nload \x00"), "no-text"},
		{"no UTF-8", []byte("load A\xff"), "no-text"},
		{"too long", make([]byte, MaxSize+1), "too-long"},
	}
	for _, test := range tests {
		f, list := Parse("x", test.src)
		if f != nil || len(list) != 1 || list[0].Code != test.code {
			t.Errorf("%s: %v %v", test.name, f, list)
		}
	}
}

func TestEmpty(t *testing.T) {
	for _, text := range []string{"", "\n \n", "# only a comment", "\uFEFF"} {
		f, list := Parse("x", []byte(text))
		if f == nil || len(f.Statements) != 0 || len(list) != 0 {
			t.Errorf("%q: %v %v", text, f, list)
		}
	}
}

func TestDepthIsBounded(t *testing.T) {
	deep := map[string]string{
		"brackets": "given x = " + strings.Repeat("(", 1e5), "calls": "given x = " + strings.Repeat("ln(", 1e5),
		"signs": "given x = " + strings.Repeat("-", 1e5), "powers": "given x = " + strings.Repeat("2^", 1e5) + "2",
	}
	for name, text := range deep {
		_, list := Parse("x", []byte(text))
		if len(list) != 1 || list[0].Code != "too-deep" {
			t.Errorf("%s: %v", name, list)
		}
	}
	if _, list := Parse("x", []byte("given x = 1"+strings.Repeat("+1", 1e5))); len(list) != 1 || list[0].Code != "too-long" {
		t.Errorf("a long sum: %v", list)
	}
	nested := strings.Repeat("(", maxDepth) + "1" + strings.Repeat(")", maxDepth)
	parse(t, "given x = "+nested)
}

func TestErrorsAreCounted(t *testing.T) {
	_, list := Parse("x", []byte(strings.Repeat("nonsense\n", 1000)))
	if len(list) != maxErrors+1 {
		t.Fatalf("%d diagnostics", len(list))
	}
	if last := list[maxErrors]; last.Message != "and 950 more errors" { // 1000 lines less the 50 reported
		t.Errorf("the last one says %q", last.Message)
	}
}

// A statement that a trailing arrow swallowed is found again.
func TestResume(t *testing.T) {
	f, list := Parse("x", []byte("path a -> R1 1k ->\nrail VCC = 12 V\nload 1 meg\nload B\npart p diode n = 2,\nload C\n"))
	if len(list) != 3 || len(f.Statements) != 3 {
		t.Errorf("%d statements, %v", len(f.Statements), list)
	}
}

// Many swallowed statements are each looked at once, though each could reach to
// the end of the text.
func TestResumeIsLinear(t *testing.T) {
	for _, line := range []string{"rail A = 5 V ->\n", "path a -> b c d ->\n", "part p diode n 2,\n", "rail A = ->\n", "path a -> 5 x,\n"} {
		const lines = 20000 // a quadratic parser would look at 10^9 tokens
		_, list := Parse("x", []byte(strings.Repeat(line, lines)))
		if len(list) != maxErrors+1 {
			t.Errorf("%q: %d diagnostics", line, len(list))
		}
	}
}

// A text of tokens in one line is read like one of many lines, and its errors are
// few. The line is so long that a scanner which looked at the rest of it for each
// token would not end.
func TestLongLines(t *testing.T) {
	for piece, most := range map[string]int{" a": 0, " 1": 1, " \"x\"": 1, " ?": 1, " é": maxErrors + 1, "->": 1, " 1 ": 1, ",": 1} {
		_, list := Parse("x", []byte("load A"+strings.Repeat(piece, 1<<18/len(piece))))
		if len(list) > most || list.HasErrors() != (most > 0) {
			t.Errorf("%q: %d diagnostics, at most %d are wanted; the first %v", piece, len(list), most, list[:1])
		}
	}
}

func ladder(elements int) []byte {
	var b bytes.Buffer
	b.WriteString("rail VCC = 12 V\n")
	for i := range elements / 2 {
		fmt.Fprintf(&b, "path n%d -> R%d 4.7 kohm 1%% 0.25 W -> n%d -> D%d sig -> gnd\n", i, i, i+1, i)
	}
	return b.Bytes()
}

func BenchmarkParse(b *testing.B) {
	src := ladder(10000)
	b.SetBytes(int64(len(src)))
	for b.Loop() {
		if _, list := Parse("x", src); list.HasErrors() {
			b.Fatal(list)
		}
	}
}
