package main

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
)

var numberText = regexp.MustCompile(`[-+]?\d+(\.\d+)?([eE][-+]?\d+)?`)

// alike compares two outputs: text to the byte, numbers within a relative
// tolerance, so that another machine's rounding is no difference. Two remainders
// of rounding are alike, whatever they are.
func alike(got, want string) error {
	const (
		tolerance = 1e-3  // a unit in the last of four digits
		remainder = 1e-10 // A and V: far below what a solution is judged by
	)
	gotLines, wantLines := strings.Split(got, "\n"), strings.Split(want, "\n")
	for i := range max(len(gotLines), len(wantLines)) {
		if i >= len(gotLines) || i >= len(wantLines) {
			return fmt.Errorf("%d lines, want %d", len(gotLines), len(wantLines))
		}
		g, w := evidence(gotLines[i]), evidence(wantLines[i])
		differ := fmt.Errorf("line %d is\n%s\nwant\n%s", i+1, g, w)
		if numberText.ReplaceAllString(g, "#") != numberText.ReplaceAllString(w, "#") {
			return differ
		}
		wantNumbers := numberText.FindAllString(w, -1)
		for k, text := range numberText.FindAllString(g, -1) {
			if text == wantNumbers[k] { // a colour may look like a number that no double holds
				continue
			}
			a, err1 := strconv.ParseFloat(text, 64)
			b, err2 := strconv.ParseFloat(wantNumbers[k], 64)
			if err1 != nil || err2 != nil {
				return differ
			}
			tiny := math.Abs(a) < remainder && math.Abs(b) < remainder
			if !tiny && math.Abs(a-b) > tolerance*max(math.Abs(a), math.Abs(b)) {
				return differ
			}
		}
	}
	return nil
}

// evidence cuts the line that tells how a point was found behind its way: the
// steps and what is left of the balances are a matter of rounding.
func evidence(line string) string {
	if strings.HasPrefix(line, "Found ") {
		line, _, _ = strings.Cut(line, " in ")
	}
	return line
}
