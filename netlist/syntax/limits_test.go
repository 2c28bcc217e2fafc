package syntax

import (
	"fmt"
	"strings"
	"testing"
)

// A text of ten thousand elements is read whole, settles, and costs each element
// what it costs in a small text.
func TestTenThousandElements(t *testing.T) {
	const many, few = 10000, 1000
	f := parse(t, string(ladder(many)))
	elements := 0
	for _, s := range f.Statements {
		path, ok := s.(*Path)
		if !ok {
			continue
		}
		for _, segment := range path.Segments {
			if segment.Element != nil {
				elements++
			}
		}
	}
	if elements != many {
		t.Errorf("%d elements of %d", elements, many)
	}
	once := Print(f)
	if twice := Print(parse(t, string(once))); string(twice) != string(once) {
		t.Error("the canonical text does not settle")
	}

	cost := func(elements int) float64 {
		src := ladder(elements)
		return testing.AllocsPerRun(1, func() { Parse("x", src) }) / float64(elements)
	}
	// Slices that grow by doubling differ by less than this.
	if large, small := cost(many), cost(few); large > 1.1*small {
		t.Errorf("an element of %d costs %.2f allocations, of %d %.2f", many, large, few, small)
	}
}

// Texts far beyond any design end in one clear error, and what is just below the
// limits is read.
func TestLimits(t *testing.T) {
	for _, test := range []struct{ name, text, says string }{
		{"50 MB", strings.Repeat("load A\n", 50<<20/7), "the text is longer than 16 MB, which no circuit needs"},
		{"bytes of a picture", "\x89PNG\r\n\x1a\n\x00\x00", "this is no text: it has a zero byte"},
		{"no UTF-8", "load A\n\xff\xfe", "this is no text: it has a byte that is no UTF-8"},
		{"digits", "given x = " + strings.Repeat("9", 5000), "the number has too many digits"},
		{"digits with a point", "given x = 0." + strings.Repeat("1", 5000), "the number has too many digits"},
		{"digits of an exponent", "given x = 1e" + strings.Repeat("9", 5000), "the number has too many digits"},
		{"brackets", "given x = " + strings.Repeat("(", maxDepth+1) + "1" + strings.Repeat(")", maxDepth+1), "more than 200 brackets, signs or powers stand within each other"},
		{"operators", "given x = 1" + strings.Repeat("+1", maxOperators+1), "the expression has more than 5000 operators"},
	} {
		_, list := Parse("x", []byte(test.text))
		if len(list) != 1 || list[0].Message != test.says {
			t.Errorf("%s: %v", test.name, list)
		}
	}
	parse(t, "given x = 1"+strings.Repeat("+1", maxOperators))
	parse(t, "given x = 0."+strings.Repeat("1", 900))
	parse(t, "title \""+strings.Repeat("x", 1<<20)+"\"")
}

// The place of what is no text is its first wrong byte.
func TestPlaceOfWhatIsNoText(t *testing.T) {
	for _, wrong := range []string{"\x00", "\xff"} {
		_, list := Parse("x", []byte("title \"Ω\"\nload µ"+wrong+" B\n"))
		if start := list[0].Span.Start; start.Line != 2 || start.Column != 7 || start.Offset != 18 { // counted by hand
			t.Errorf("%q is found at %+v", wrong, start)
		}
	}
}

// A character that begins nothing is told once, with what was probably meant.
func TestStrayCharacters(t *testing.T) {
	for text, want := range map[string]string{
		"title “x”":       "the character '“' has no meaning here; texts stand between straight quotation marks: \"…\"",
		"load A; B":       "the character ';' has no meaning here; a statement ends with its line",
		"load [A]":        "the character '[' has no meaning here; brackets are round",
		"keep A.V ≤ 5 V":  "the character '≤' has no meaning here; bounds are written < and >",
		"load Ωx1_y":      "Ωx1_y is no name; names are made of ASCII letters, digits and _",
		"load \x1b[31m":   "the character '\\x1b' has no meaning here; ",
		"title \"x":       "the text in quotation marks does not end on its line; end it with \"",
		"given x = .5 V":  "a number begins with a digit; write 0.5 V",
		"given x = 1,5 V": "1,5 V has a decimal comma; the decimal point is a point: 1.5 V",
		"given x = 1.5,2": "expected the end of the line, not ,; ", // a point stands there already
	} {
		_, list := Parse("x", []byte(text+"\nload OK\n"))
		if len(list) != 1 {
			t.Errorf("%q: %v", text, list)
			continue
		}
		if got := fmt.Sprintf("%s; %s", list[0].Message, list[0].Hint); got != want {
			t.Errorf("%q: %s", text, got)
		}
	}
}
