package netlist

import (
	"strconv"
	"strings"
	"testing"

	"biaswright/netlist/diag"
)

// repeat writes a line n times; $ stands for the number, $+ for the next one.
func repeat(n int, line string) string {
	var b strings.Builder
	for i := range n {
		b.WriteString(strings.NewReplacer("$+", strconv.Itoa(i+1), "$", strconv.Itoa(i)).Replace(line))
		b.WriteByte('\n')
	}
	return b.String()
}

// A file that is wrong from end to end must neither take long nor say the same
// thing a thousand times. Nothing here is timed; what grew with the square of the
// size would show.
func TestWrongFromEndToEnd(t *testing.T) {
	const n = 1200
	head := "rail VCC = 5 V\npart sig diode\npath VCC -> RT 1k -> gnd\n"
	for _, tt := range []struct {
		name, text, code string
		most             int
	}{
		{"loops of links", repeat(n, "path n$ -> L$ 0 -> n$+") + repeat(n, "path n$ -> K$ 0 -> n$+"), "voltage-loop", mostFindings},
		{"islands", repeat(n, "path a$ -> R$ 1k -> b$"), "no-ground", mostFindings},
		{"dead ends", repeat(n, "path VCC -> R$ 1k -> b$"), "dead-end", mostFindings},
		{"cuts", repeat(n, "path VCC -> I$ 1 mA -> a$ -> J$ 1 mA -> gnd"), "current-cut", mostFindings},
		{"a chain of given values", repeat(n, "given G$ = G$+"), "circle", n / deepest},
		{"beside in a circle", repeat(n, "path VCC -> D$ sig beside=D$+ -> gnd") + "path VCC -> D1200 sig beside=D0 -> gnd", "circle", 1},
		{"rows", repeat(n, "path VCC -> D$ sig row=1000 -> gnd"), "row", 1},
		{"unknown parts", repeat(n, "path VCC -> D$ sgi$ -> gnd"), "unknown-name", n},
	} {
		t.Run(tt.name, func(t *testing.T) {
			c, diags := Read("wrong.bias", []byte(head+tt.text), testCatalogue(), nil)
			if c != nil {
				t.Fatal("no error")
			}
			found := 0
			for _, d := range diags {
				if d.Code == tt.code {
					found++
				}
			}
			if found == 0 || found > tt.most {
				t.Errorf("%d findings of %s, want 1 to %d", found, tt.code, tt.most)
			}
		})
	}
}

// Errors of every kind come out in one run and in the order of the text, but none
// that may follow from a statement that did not parse.
func TestErrorsOfOneRun(t *testing.T) {
	c, diags := Read("mixed.bias", []byte(`rail VCC = 12 V
path VCC -> R1 5 V -> a -> D1 sig -> gnd
part sig diode n = = 2
keep a.V < 3 A
keep b.V < 3 V
path a -> R2 -5 -> gnd
`), testCatalogue(), nil)
	if c != nil {
		t.Fatal("no error")
	}
	var lines []int
	for _, d := range diags {
		if d.Severity == diag.Error {
			lines = append(lines, d.Span.Start.Line)
		}
	}
	if got, want := join(lines), "2 3 4 6 "; got != want {
		t.Errorf("errors in lines %s, want %s: %v", got, want, diags)
	}
}

func join(numbers []int) string {
	out := ""
	for _, n := range numbers {
		out += strconv.Itoa(n) + " "
	}
	return out
}

func TestWarnings(t *testing.T) {
	c := read(t, `rail VCC = 12 V
rail VX = 5 V
part sig diode
part gp npn
given A = 3 V
path VCC -> R1 1k -> gnd
path VCC -> D1 sig -> VCC
`)
	var got []string
	for _, d := range c.Warnings {
		got = append(got, d.Message)
	}
	want := []string{
		"nothing is connected to the rail VX", "no element uses the part gp", "nothing uses A", "D1 does nothing: all its ends are at VCC",
	}
	if strings.Join(got, "\n") != strings.Join(want, "\n") {
		t.Errorf("warnings:\n%s", strings.Join(got, "\n"))
	}
}
