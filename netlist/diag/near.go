package diag

import "strings"

// Nearest returns the candidate that word was probably meant to be, or "" where
// none is near. A candidate that differs in case alone wins; otherwise the one
// with the fewest slips (a letter too many, too few, wrong, or two exchanged),
// the earlier one of equals. Short words allow fewer slips.
func Nearest(word string, candidates []string) string {
	for _, c := range candidates {
		if c != word && strings.EqualFold(c, word) {
			return c
		}
	}
	w := []rune(strings.ToLower(word))
	best, fewest := "", slipsAllowed(len(w))+1
	for _, c := range candidates {
		if c == word {
			continue
		}
		if n := slips(w, []rune(strings.ToLower(c)), fewest); n < fewest {
			best, fewest = c, n
		}
	}
	return best
}

// DidYouMean is Nearest as a hint: "did you mean tail?", or "".
func DidYouMean(word string, candidates []string) string {
	if n := Nearest(word, candidates); n != "" {
		return "did you mean " + n + "?"
	}
	return ""
}

// slipsAllowed is one in three letters. Below three letters any word is one
// slip from any other, so none is allowed.
func slipsAllowed(letters int) int {
	const oneIn, most = 3, 3
	return min(letters/oneIn, most)
}

// slips counts the edits between a and b, an exchange of neighbours being one.
// It gives up at limit and then returns limit.
func slips(a, b []rune, limit int) int {
	if d := len(a) - len(b); d >= limit || -d >= limit {
		return limit
	}
	before, last, row := make([]int, len(b)+1), make([]int, len(b)+1), make([]int, len(b)+1)
	for j := range last {
		last[j] = j
	}
	for i := 1; i <= len(a); i++ {
		row[0] = i
		least := i
		for j := 1; j <= len(b); j++ {
			cost := 1
			if a[i-1] == b[j-1] {
				cost = 0
			}
			row[j] = min(last[j]+1, row[j-1]+1, last[j-1]+cost)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				row[j] = min(row[j], before[j-2]+1)
			}
			least = min(least, row[j])
		}
		// An exchange reaches back two rows, and so can cost no less than the
		// row before this one already did.
		if least > limit {
			return limit
		}
		before, last, row = last, row, before
	}
	return min(last[len(b)], limit)
}
