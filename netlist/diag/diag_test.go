package diag_test

import (
	"encoding/json"
	"fmt"
	"os"
	"strings"
	"testing"

	"biaswright/netlist/diag"
)

// span is a place on one line, columns counted from 1 in code points.
func span(text string, line, from, to int) diag.Span {
	lines := strings.SplitAfter(text, "\n")
	offset := 0
	for _, l := range lines[:line-1] {
		offset += len(l)
	}
	runes := []rune(lines[line-1])
	at := func(column int) diag.Position {
		return diag.Position{Line: line, Column: column, Offset: offset + len(string(runes[:column-1]))}
	}
	return diag.Span{File: "mast.bias", Start: at(from), End: at(to)}
}

func write(p *diag.Printer, l diag.List) string {
	var b strings.Builder
	if err := p.Write(&b, l); err != nil {
		panic(err)
	}
	return b.String()
}

func TestText(t *testing.T) {
	for _, test := range []struct {
		name, source string
		from, to     int
		plain        bool
		want         string
	}{
		{"a word", "path a -> D1 sgi -> gnd\n", 14, 17, false, "  path a -> D1 sgi -> gnd\n               ^~~\n"},
		{"behind a tab", "\tR1 x\n", 5, 6, false, "      R1 x\n         ^\n"},
		{"behind a wide letter", "# 漢 x\n", 5, 6, false, "  # 漢 x\n       ^\n"},
		{"behind an ohm sign", "R1 68 Ω x\n", 9, 10, true, "  R1 68 ? x\n          ^\n"},
		{"at the end of the line", "path a ->\n", 10, 10, false, "  path a ->\n           ^\n"},
		{"a control character", "a \x1b[31m b\n", 9, 10, false, "  a ?[31m b\n          ^\n"},
		{"behind a combining accent", "# e\u0301 x\n", 6, 7, false, "  # e\u0301 x\n      ^\n"},
		{"behind a byte order mark", "\uFEFFR1 x\n", 5, 6, false, "  R1 x\n     ^\n"},
		{"a line that ends in CR LF", "R1 x\r\n", 4, 5, false, "  R1 x\n     ^\n"},
	} {
		t.Run(test.name, func(t *testing.T) {
			p := &diag.Printer{Source: func(string) []byte { return []byte(test.source) }, Plain: test.plain}
			got := write(p, diag.List{{Message: "what", Span: span(test.source, 1, test.from, test.to)}})
			head := fmt.Sprintf("mast.bias:1:%d: error: what\n", test.from)
			if !strings.HasPrefix(got, head) {
				t.Fatalf("%q does not begin with %q", got, head)
			}
			if strings.ContainsRune(got, '\x1b') {
				t.Errorf("%q: a control character reaches the terminal", got)
			}
			if body := strings.TrimPrefix(got, head); body != test.want {
				t.Errorf("got\n%swant\n%s", body, test.want)
			}
		})
	}
}

// The caret stands under its word wherever a long line is cut.
func TestLongLineIsCut(t *testing.T) {
	line := strings.Repeat("word ", 100) + "here" + strings.Repeat(" word", 100) + "\n"
	p := &diag.Printer{Source: func(string) []byte { return []byte(line) }}
	lines := strings.Split(write(p, diag.List{{Message: "what", Span: span(line, 1, 501, 505)}}), "\n")
	const widest = 120
	if len(lines) < 3 || len([]rune(lines[1])) > widest {
		t.Fatalf("the line was not cut: %q", lines)
	}
	at := strings.IndexByte(lines[2], '^')
	if at < 0 || !strings.HasPrefix(string([]rune(lines[1])[at:]), "here") {
		t.Errorf("the caret is not under its word:\n%s\n%s", lines[1], lines[2])
	}
}

func TestWithoutPlaceOrSource(t *testing.T) {
	if got, want := write(&diag.Printer{}, diag.List{{Message: "what"}}), "biaswright: error: what\n"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	text := "a\n"
	p := &diag.Printer{Source: func(string) []byte { return nil }}
	if got, want := write(p, diag.List{{Severity: diag.Warning, Message: "what", Span: span(text, 1, 1, 2)}}), "mast.bias:1:1: warning: what\n"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
}

func TestLimit(t *testing.T) {
	l := make(diag.List, 60)
	for i := range l {
		l[i].Message = fmt.Sprint(i)
	}
	got := write(&diag.Printer{Limit: 50}, l)
	if strings.Count(got, "error:") != 50 || !strings.HasSuffix(got, "and 10 more\n") {
		t.Errorf("%d messages, ending %q", strings.Count(got, "error:"), got[len(got)-20:])
	}
}

func TestSortAndUnique(t *testing.T) {
	text := "ab\ncd\n"
	l := diag.List{
		{Message: "late", Span: span(text, 2, 1, 2)},
		{Message: "warned", Severity: diag.Warning, Span: span(text, 1, 1, 2)},
		{Message: "early", Span: span(text, 1, 1, 2)},
		{Message: "nowhere"},
		{Message: "late", Span: span(text, 2, 1, 2)},
	}
	l = l.Unique()
	l.Sort()
	var got []string
	for _, d := range l {
		got = append(got, d.Message)
	}
	if s := strings.Join(got, " "); s != "nowhere early warned late" {
		t.Errorf("order %q", s)
	}
	if !l.HasErrors() || (diag.List{{Severity: diag.Warning}}).HasErrors() {
		t.Error("HasErrors does not tell errors from warnings")
	}
}

func TestNearest(t *testing.T) {
	names := []string{"tail", "bias", "LAMP", "gp", "betaF"}
	for word, want := range map[string]string{
		"tial": "tail", "tails": "tail", "bais": "bias", "lamp": "LAMP", "Lamp": "LAMP", "BIAS": "bias",
		"beta": "betaF", "xyz": "", "": "", "pg": "", "GP": "gp", "emitter": "",
	} {
		if got := diag.Nearest(word, names); got != want {
			t.Errorf("nearest to %q is %q, want %q", word, got, want)
		}
	}
	if got := diag.Nearest("tail", nil); got != "" {
		t.Errorf("nearest of none is %q", got)
	}
}

func TestJSON(t *testing.T) {
	text := "rail VCC = 5\n"
	data, err := json.Marshal(diag.Diagnostic{
		Code: "unit", Message: "what", Span: span(text, 1, 12, 13), Hint: "why",
		Related: []diag.Related{{Span: span(text, 1, 6, 9), Message: "declared here"}},
	})
	if err != nil {
		t.Fatal(err)
	}
	var got struct {
		File                          string
		Line, Column                  int
		End                           struct{ Line, Column int }
		Code, Severity, Message, Hint string
		Related                       []struct {
			Line, Column int
			Message      string
		}
	}
	if err := json.Unmarshal(data, &got); err != nil {
		t.Fatalf("%s: %v", data, err)
	}
	if got.File != "mast.bias" || got.Line != 1 || got.Column != 12 || got.End.Column != 13 ||
		got.Code != "unit" || got.Severity != "error" || got.Message != "what" || got.Hint != "why" ||
		len(got.Related) != 1 || got.Related[0].Column != 6 {
		t.Errorf("%s", data)
	}
}

func ExamplePrinter() {
	text := "path VCC -> D1 sgi -> gnd\n"
	p := diag.Printer{Source: func(string) []byte { return []byte(text) }}
	_ = p.Write(os.Stdout, diag.List{{
		Code: "unknown-name", Message: "there is no part sgi", Span: span(text, 1, 16, 19),
		Hint: diag.DidYouMean("sgi", []string{"sig", "gp"}),
	}})
	// Output:
	// mast.bias:1:16: error: there is no part sgi
	//   path VCC -> D1 sgi -> gnd
	//                  ^~~
	//   hint: did you mean sig?
}
