package diag_test

import (
	"encoding/json"
	"errors"
	"fmt"
	"strings"
	"testing"
	"unicode"

	"github.com/clipperhouse/displaywidth"
	"pgregory.net/rapid"

	"biaswright/netlist/diag"
)

func printer(text string) *diag.Printer {
	return &diag.Printer{Source: func(string) []byte { return []byte(text) }}
}

// The mark of a span over several lines ends with its first; hint and related
// places follow.
func TestWholeDiagnostic(t *testing.T) {
	text := "path a ->\n  b c\n"
	got := write(printer(text), diag.List{{
		Severity: diag.Warning, Message: "what", Hint: "why", Span: span(text, 1, 6, 7).To(span(text, 2, 3, 4)),
		Related: []diag.Related{{Span: span(text, 2, 5, 6), Message: "first declared here"}},
	}})
	want := "mast.bias:1:6: warning: what\n  path a ->\n       ^~~~\n  hint: why\n  mast.bias:2:5: first declared here\n"
	if got != want {
		t.Errorf("got\n%swant\n%s", got, want)
	}
}

// A place that the text does not have, and a file as a whole, show no line.
func TestPlacesWithoutLine(t *testing.T) {
	far := diag.Position{Line: 9, Column: 9, Offset: 900}
	for want, s := range map[string]diag.Span{
		"mast.bias:9:9: error: what\n": {File: "mast.bias", Start: far, End: far},
		"mast.bias: error: what\n":     {File: "mast.bias"},
	} {
		if got := write(printer("R1 x\n"), diag.List{{Message: "what", Span: s}}); got != want {
			t.Errorf("%q, want %q", got, want)
		}
	}
}

func TestColour(t *testing.T) {
	p := printer("R1 x\n")
	p.Colour = true
	for severity, want := range map[diag.Severity]string{
		diag.Error:   "mast.bias:1:4: \x1b[1;31merror:\x1b[0m what\n  R1 x\n     \x1b[1;31m^\x1b[0m\n", // ECMA-48: 1 bold, 31 red, 33 yellow
		diag.Warning: "mast.bias:1:4: \x1b[1;33mwarning:\x1b[0m what\n  R1 x\n     \x1b[1;33m^\x1b[0m\n",
	} {
		if got := write(p, diag.List{{Severity: severity, Message: "what", Span: span("R1 x\n", 1, 4, 5)}}); got != want {
			t.Errorf("%q, want %q", got, want)
		}
	}
}

type broken struct{}

var errBroken = errors.New("the pipe is broken")

func (broken) Write([]byte) (int, error) { return 0, errBroken }

func TestWriteTellsOfFailure(t *testing.T) {
	if err := new(diag.Printer).Write(broken{}, diag.List{{Message: "what"}}); !errors.Is(err, errBroken) {
		t.Errorf("error %v", err)
	}
}

// Whatever a line, a span and a message hold, the output is bounded, each of its
// lines fits, no character of it moves the cursor, and the mark stands below the
// line.
func TestTextIsBounded(t *testing.T) {
	piece := rapid.SampledFrom([]string{"a", "word ", "\t", "漢", "é", "e\u0301", "\x1b[2J", "\u200b", "\u202e", "\r", "\x00", "\xff", "Ω", "👩‍🔧"})
	rapid.Check(t, func(t *rapid.T) {
		line := strings.Join(rapid.SliceOfN(piece, 1, 60).Draw(t, "line"), "")
		line = strings.Repeat(line, rapid.SampledFrom([]int{1, 1, 40}).Draw(t, "times"))
		from := rapid.IntRange(0, len(line)).Draw(t, "from")
		to := rapid.IntRange(from, len(line)).Draw(t, "to")
		s := diag.Span{File: "a\x1b.bias", Start: diag.Position{Line: 1, Column: from + 1, Offset: from}, End: diag.Position{Line: 1, Column: to + 1, Offset: to}}
		p := printer(line + "\nnext\n")
		p.Plain = rapid.Bool().Draw(t, "plain")
		message := strings.Join(rapid.SliceOfN(piece, 1, 9).Draw(t, "message"), "") + "\nb"
		got := write(p, diag.List{{Message: message, Span: s, Hint: message, Related: []diag.Related{{Span: s, Message: message}}}})
		lines := strings.Split(strings.TrimSuffix(got, "\n"), "\n")
		if len(lines) != 5 { // the message, the line, its mark, the hint, the related place
			t.Fatalf("%d lines: %q", len(lines), got)
		}
		for _, r := range got {
			if r != '\n' && !unicode.IsPrint(r) && !unicode.IsMark(r) {
				t.Fatalf("%q holds %q", got, r)
			}
		}
		const page = 2 + 110 // the indent and the window that the printer states
		for _, l := range lines[1:3] {
			if w := displaywidth.String(l); w > page {
				t.Fatalf("%d columns: %q", w, l)
			}
		}
		if mark := strings.TrimLeft(lines[2], " "); !strings.HasPrefix(mark, "^") || strings.Trim(mark[1:], "~") != "" {
			t.Fatalf("the mark is %q", lines[2])
		}
	})
}

// The mark stands below its word wherever that is in a line, wide letters before
// it or not, the line cut or not.
func TestMarkStandsBelowItsWord(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		filler := rapid.SliceOfN(rapid.SampledFrom([]string{"a", " ", "\t", "漢", "é", "Ω"}), 0, 300)
		before := strings.Join(filler.Draw(t, "before"), "")
		line := before + "X" + strings.Join(filler.Draw(t, "after"), "")
		column := len([]rune(before)) + 1
		lines := strings.Split(write(printer(line), diag.List{{Message: "what", Span: span(line, 1, column, column+1)}}), "\n")
		head, _, ok := strings.Cut(lines[1], "X")
		if at := strings.IndexByte(lines[2], '^'); !ok || displaywidth.String(head) != at {
			t.Fatalf("the mark is not below X:\n%s\n%s", lines[1], lines[2])
		}
	})
}

// Every key of the JSON form stands in its place even where there is nothing to
// say, and related is a list, never null.
func TestJSONKeys(t *testing.T) {
	data, err := json.Marshal(diag.Diagnostic{Severity: diag.Warning, Message: "what"})
	if err != nil {
		t.Fatal(err)
	}
	want := `{"file":"","line":0,"column":0,"end":{"line":0,"column":0},"code":"","severity":"warning","message":"what","hint":"","related":[]}`
	if string(data) != want {
		t.Errorf("got\n%s\nwant\n%s", data, want)
	}
}

// Sorting keeps a list's diagnostics, is stable, and knows files before places.
func TestSort(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l := make(diag.List, rapid.IntRange(0, 12).Draw(t, "n"))
		for i := range l {
			l[i] = diag.Diagnostic{
				Severity: diag.Severity(rapid.IntRange(0, 1).Draw(t, "severity")), Related: make([]diag.Related, i), // their number tells it from the others
				Span: diag.Span{File: rapid.SampledFrom([]string{"", "a", "b"}).Draw(t, "file"), Start: diag.Position{Offset: rapid.IntRange(0, 2).Draw(t, "at")}},
			}
		}
		l.Sort()
		seen, last := map[int]bool{}, ""
		for _, d := range l {
			seen[len(d.Related)] = true
			// A space sorts before the names; the last number is the place as found.
			key := fmt.Sprintf("%s %d %d %02d", d.Span.File, d.Span.Start.Offset, d.Severity, len(d.Related))
			if key < last {
				t.Fatalf("%q stands before %q", last, key)
			}
			last = key
		}
		if len(seen) != len(l) {
			t.Fatalf("%d of %d are left", len(seen), len(l))
		}
	})
}

// One slip in a word of three letters or more is found again, and any words
// whatever are only compared.
func TestNearestFindsOneSlip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		word := []rune(rapid.StringMatching(`[a-z]{3,12}`).Draw(t, "word"))
		at := rapid.IntRange(0, len(word)-2).Draw(t, "at")
		slip := append([]rune{}, word...)
		switch rapid.IntRange(0, 2).Draw(t, "slip") {
		case 0:
			slip[at], slip[at+1] = slip[at+1], slip[at]
		case 1:
			slip[at] = '_'
		case 2:
			slip = append(slip[:at:at], append([]rune{'_'}, slip[at:]...)...)
		}
		if string(slip) == string(word) {
			return
		}
		if got := diag.Nearest(string(slip), []string{"0000000", string(word)}); got != string(word) {
			t.Fatalf("%s for %s: %q", string(slip), string(word), got)
		}
		if hint := diag.DidYouMean(string(slip), []string{string(word)}); hint != "did you mean "+string(word)+"?" {
			t.Fatalf("the hint is %q", hint)
		}
	})
	rapid.Check(t, func(t *rapid.T) {
		word, candidates := rapid.String().Draw(t, "word"), rapid.SliceOf(rapid.String()).Draw(t, "candidates")
		got := diag.Nearest(word, candidates)
		if got == word && got != "" {
			t.Fatalf("%q is said to be meant by itself", word)
		}
		if (diag.DidYouMean(word, candidates) == "") != (got == "") {
			t.Fatal("the hint does not agree")
		}
	})
}
