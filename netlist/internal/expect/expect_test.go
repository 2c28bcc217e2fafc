package expect

import (
	"slices"
	"testing"

	"biaswright/netlist/diag"
)

func TestCheck(t *testing.T) {
	at := func(line int, message string) diag.Diagnostic {
		return diag.Diagnostic{Message: message, Span: diag.Span{Start: diag.Position{Line: line, Column: 1}}}
	}
	text := "one # error: bad word | bad number\ntwo\nthree # error: lost"
	if got := Check(text, diag.List{at(1, "a bad number"), at(1, "a bad word"), at(3, "it is lost")}); got != nil {
		t.Errorf("what was expected differs: %q", got)
	}
	got := Check(text, diag.List{at(1, "a bad number"), at(1, "a bad number"), at(2, "x")})
	want := []string{
		"1:1: unexpected error: a bad number", "2:1: unexpected error: x", "1: missing error: bad word", "3: missing error: lost",
	}
	if !slices.Equal(got, want) {
		t.Errorf("got %q", got)
	}
}
