package syntax

import (
	"fmt"
	"regexp"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// The texts below are drawn from the grammar of the package's documentation, with
// spaces, line ends and comments wherever it allows them.

func oneOf(t *rapid.T, words ...string) string { return rapid.SampledFrom(words).Draw(t, "word") }

func drawName(t *rapid.T) string {
	return oneOf(t, "a", "R1", "path", "load", "2N2222", "tail", "exp", "rail", "at_1", "D1", "V", "K")
}

func drawNumber(t *rapid.T) string {
	return oneOf(t, "5", "1.8k", "4k7", "10K", "1e-3A", "12 V", "12V", "-3 mV", "68 Ω", "10µA", "25°C", "-40 degC", "100R", "+2", "3 V/K", "1 K/W")
}

// drawOperand is a number without a sign, which in an expression is an operator.
func drawOperand(t *rapid.T, depth int) string {
	switch rapid.IntRange(0, 6).Draw(t, "operand") {
	case 0, 1:
		return strings.TrimLeft(drawNumber(t), "+")
	case 2:
		return drawName(t)
	case 3:
		return oneOf(t, "LAMP.1.I", "D1:D2.V", "tail.V", "LAMP.1:LAMP.2.V")
	case 4:
		return oneOf(t, "sqrt", "ln", "parallel") + "(" + drawExpr(t, depth-1) + ", " + drawExpr(t, depth-1) + ")"
	case 5:
		return oneOf(t, "-", "+", "- ") + drawOperand(t, depth-1)
	}
	return "(" + drawExpr(t, depth-1) + ")"
}

func drawExpr(t *rapid.T, depth int) string {
	if depth <= 0 {
		return oneOf(t, "2", "tail.V", "RE", "-20 degC", "3 V")
	}
	text := drawOperand(t, depth)
	for range rapid.IntRange(0, 3).Draw(t, "operators") {
		text += oneOf(t, "+", " - ", "*", " / ", "^") + drawOperand(t, depth)
	}
	return text
}

func drawBounds(t *rapid.T) string {
	ends := oneOf(t, " 5%", " ±5 %", "(100..300)", " ( -1 V .. 2 V )", "")
	if ends == "" {
		return oneOf(t, "", " pick 1 2 3")
	}
	return ends + oneOf(t, "", " normal", " pick 100 150 -250")
}

func drawValue(t *rapid.T) string {
	return rapid.OneOf(rapid.Just("infinite"), rapid.Custom(drawNumber), rapid.Custom(drawName)).Draw(t, "value") + drawBounds(t)
}

// drawJoint is what may stand between two pieces of a statement that a mark
// joins: the mark, and line ends and comments on one side of it.
func drawJoint(t *rapid.T, mark string, leads bool) string {
	lines := oneOf(t, "\n", " # why\n", "\r\n\n  # own\n", " # why\n# own\n\n# two\n")
	switch rapid.IntRange(0, 3).Draw(t, "joint") {
	case 0:
		return " " + mark + lines
	case 1:
		if leads {
			return lines + " " + mark + " "
		}
	}
	return " " + mark + " "
}

func drawElement(t *rapid.T) string {
	text := drawName(t) + " " + oneOf(t, "1.8k", "R22", "sig", "drop 2 V", "cell 1.5 V 5%", "? E24", "-10 uA", "68Ω", "10K")
	for range rapid.IntRange(0, 3).Draw(t, "modifiers") {
		text += oneOf(t, " reversed", " row=2", " base=bias", " 100 ppm/K", " -5%/K", " 0.25W", " beside = Q1", " 1%", " size=RL", " base=D1:D2")
	}
	return text
}

func drawList(t *rapid.T, item func(*rapid.T) string, mark string, leads bool) string {
	text := item(t)
	for range rapid.IntRange(0, 12).Draw(t, "items") {
		text += drawJoint(t, mark, leads) + item(t)
	}
	return text
}

func drawParam(t *rapid.T) string {
	return drawName(t) + "=" + drawValue(t) + oneOf(t, "", " at 1 mA", " at I0")
}

func drawAssumption(t *rapid.T) string {
	return drawName(t) + oneOf(t, "", "(sig)", " ( sig )") + " = " + drawValue(t)
}

func drawSegment(t *rapid.T) string {
	return rapid.OneOf(rapid.Custom(drawName), rapid.Just("D1:D2"), rapid.Custom(drawElement)).Draw(t, "segment")
}

func drawStatement(t *rapid.T) string {
	const depth = 3 // of brackets
	switch rapid.IntRange(0, 14).Draw(t, "statement") {
	case 0:
		return `title "a \"b\" \\ µ"`
	case 1:
		return oneOf(t, `use "parts.bias"`, "use generic")
	case 2:
		return "given " + drawName(t) + "=" + drawExpr(t, depth) + drawBounds(t)
	case 3:
		return "rail " + drawName(t) + " = " + drawValue(t)
	case 4:
		return "ambient=" + drawValue(t)
	case 5, 6:
		return "part " + drawName(t) + " diode " + drawList(t, drawParam, ",", false)
	case 7, 8:
		return "path " + drawList(t, drawSegment, "->", true)
	case 9:
		return "place Q1 gp collector=out base = bias emitter=D1:D2 " + oneOf(t, "", "size=8", "beside=Q2")
	case 10:
		return oneOf(t, "load ", "batch ") + oneOf(t, "A", "A  B", "LAMP.1 LAMP.2")
	case 11:
		return "hold " + drawExpr(t, depth) + " within " + drawValue(t)
	case 12:
		return oneOf(t, "target ", "measured ") + drawExpr(t, depth) + " = " + drawValue(t)
	case 13:
		return oneOf(t, "keep ", "keep -") + drawExpr(t, depth) + oneOf(t, "<", " > ") + drawExpr(t, depth)
	}
	return oneOf(t, "hand x.V = "+drawExpr(t, depth), "assume "+drawList(t, drawAssumption, ",", false))
}

var commentText = regexp.MustCompile(`#[^\r\n]*`)

// comments are the texts behind the # of a text whose titles have none, sorted: a
// comment within a statement that has one line moves before it.
func comments(text []byte) []string {
	var out []string
	for _, c := range commentText.FindAll(text, -1) {
		out = append(out, string(c))
	}
	slices.Sort(out)
	return out
}

// Whatever the grammar allows is accepted; its canonical text means the same,
// settles at once, and has the same comments.
func TestCanonicalTextMeansTheSame(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var b strings.Builder
		for range rapid.IntRange(1, 6).Draw(t, "statements") {
			b.WriteString(oneOf(t, "", "\n", "# note\n", "\n\n# note\n\n"))
			fmt.Fprintf(&b, "%s%s", drawStatement(t), oneOf(t, "\n", " # behind\n", "\r\n"))
		}
		text := b.String()
		f, list := Parse("drawn", []byte(text))
		if list.HasErrors() {
			t.Fatalf("refused: %v\n%s", list, text)
		}
		settles(t, f)
		if got, want := comments(Print(f)), comments([]byte(text)); !slices.Equal(got, want) {
			t.Fatalf("of the comments %q are left %q in\n%s", want, got, Print(f))
		}
	})
}
