package quantity

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// A Reading is a quantity as a text has it.
type Reading struct {
	Quantity
	// Length is how many bytes of the text it takes, a unit behind a space
	// included.
	Length int
	// Bare tells that no unit was written; Infinite that the word was
	// "infinite" (Value is then +Inf).
	Bare, Infinite bool
	// Number and Suffix are the digits and the prefix with its unit as written.
	// A letter code (4k7) is all Number.
	Number, Suffix string
	// Code tells that it was written as an IEC 60062 letter code; Spaced that a
	// space stands between Number and Suffix.
	Code, Spaced bool
}

// Percent tells that the number was written in percent.
func (r *Reading) Percent() bool { return r.Suffix == "%" }

// An Error says why a text is no quantity, and what to write instead.
type Error struct {
	Code    string // "bad-number", "bad-unit"
	Message string
	Hint    string // may be empty
	Length  int    // bytes of the text that it speaks of
}

// Error returns the message and the hint.
func (e *Error) Error() string {
	if e.Hint == "" {
		return e.Message
	}
	return e.Message + " (" + e.Hint + ")"
}

// ErrName is returned for a text that begins with a name (2N2222) or with
// something else that is no quantity.
var ErrName = errors.New("not a quantity")

// Scan reads the quantity at the head of a text: digits, an optional point and
// digits, an optional exponent; then an SI prefix and a unit, either at once or
// after spaces (then not a prefix alone); or an IEC 60062 letter code. It has no
// sign. The error is ErrName or an *Error.
//
// The number is the float64 nearest to the decimal number that the text states,
// prefix and all: 4k7 is exactly 4700.
func Scan(text string) (Reading, error) {
	n := scanNumber(text)
	if n.length == 0 {
		return Reading{}, ErrName
	}
	tail := text[n.length:]
	run := unitRun(tail)
	if !continues(tail) {
		return scanSpaced(text, n)
	}
	if s, length, ok := suffixAt(tail, run); ok {
		return n.reading(text, s, tail[:length], n.length+length)
	}
	if r, ok := scanCode(text, n); ok {
		return r, nil
	}
	word := wordRun(text)
	if isMeg(tail) {
		return Reading{}, megError(text, n.length, word)
	}
	if n.couldBeName && isASCIIName(text[:word]) {
		return Reading{}, ErrName
	}
	return Reading{}, unitError(text, n.length, max(word, n.length+run))
}

// Parse reads a whole text as a quantity, with a sign, or the word infinite.
func Parse(text string) (Reading, error) {
	trimmed := strings.TrimSpace(text)
	if trimmed == "infinite" {
		return Reading{Quantity: Quantity{Value: math.Inf(1)}, Length: len(text), Infinite: true, Bare: true, Number: trimmed}, nil
	}
	body, negative := trimmed, false
	for _, sign := range []string{"-", "\u2212", "+"} { // hyphen, minus sign, plus
		if rest, ok := strings.CutPrefix(trimmed, sign); ok {
			body, negative = strings.TrimLeft(rest, " "), sign != "+"
			break
		}
	}
	r, err := Scan(body)
	if errors.Is(err, ErrName) {
		if r, ok := ScanCode(body); ok {
			return r.signed(negative, len(text)), nil
		}
		if body == "" {
			return r, &Error{Code: "bad-number", Message: "there is no number", Length: len(text)}
		}
		return r, &Error{Code: "bad-number", Message: fmt.Sprintf("%s is not a number with a unit", clip(text)), Hint: likely(body), Length: len(text)}
	}
	if err != nil {
		return r, err
	}
	if r.Length != len(body) {
		e := &Error{Code: "bad-number", Message: fmt.Sprintf("%s is more than one number with a unit", clip(text)), Length: len(text)}
		if rest := body[r.Length:]; rest[0] == ',' {
			e.Hint = "the decimal point is a point: " + strings.Replace(body, ",", ".", 1)
		} else if fix := likely(body); fix != "" {
			e.Hint = fix
		}
		return r, e
	}
	return r.signed(negative, len(text)), nil
}

// signed is the reading of a whole text of that length, with its sign.
func (r Reading) signed(negative bool, length int) Reading {
	if negative {
		r.Value = -r.Value
	}
	r.Length = length
	return r
}

// Reads tells whether a word reads as a quantity wherever it stands: 5V, 4k7,
// 1e3. A code that begins with its letter (R22) does not: it is a name except as
// an element's second word.
func Reads(word string) bool {
	r, err := Scan(word)
	return err == nil && r.Length == len(word)
}

// Likely returns the quantity that a word with a wrong unit was probably meant
// to be: "12 V" for "12v" and for "12 volts".
func Likely(text string) (string, bool) {
	n := scanNumber(text)
	if n.length == 0 {
		return "", false
	}
	unit, ok := likelyUnit(strings.TrimLeft(text[n.length:], " \t"))
	if !ok {
		return "", false
	}
	return join(text[:n.length], unit), true
}

func likely(text string) string {
	if fix, ok := Likely(text); ok {
		return "write " + fix
	}
	return ""
}

// A number is the digits at the head of a text.
type number struct {
	length int
	// couldBeName: it has no point and no signed exponent, so that the word may
	// go on as a name.
	couldBeName bool
	// plain: digits alone.
	plain bool
}

func scanNumber(s string) number {
	i := digits(s, 0)
	if i == 0 {
		return number{}
	}
	n := number{couldBeName: true, plain: true}
	if i+1 < len(s) && s[i] == '.' && isDigit(s[i+1]) {
		i = digits(s, i+1)
		n.couldBeName, n.plain = false, false
	}
	if i < len(s) && (s[i] == 'e' || s[i] == 'E') {
		j := i + 1
		signed := j < len(s) && (s[j] == '+' || s[j] == '-')
		if signed {
			j++
		}
		if end := digits(s, j); end > j {
			i = end
			n.plain = false
			n.couldBeName = n.couldBeName && !signed
		}
	}
	n.length = i
	return n
}

func digits(s string, from int) int {
	for from < len(s) && isDigit(s[from]) {
		from++
	}
	return from
}

func isDigit(b byte) bool { return b >= '0' && b <= '9' }

func isLetter(b byte) bool { return b|0x20 >= 'a' && b|0x20 <= 'z' } // 0x20 is the ASCII case bit

// isUnitRune tells what a unit is made of, apart from the slash.
func isUnitRune(r rune) bool {
	switch r {
	case '%', '°', '\u00b5', '\u03bc', '\u03a9', '\u2126':
		return true
	}
	return r < utf8.RuneSelf && isLetter(byte(r))
}

// unitRun is the length of the characters at the head of s that a unit is made of.
func unitRun(s string) int {
	for i, r := range s {
		if !isUnitRune(r) {
			return i
		}
	}
	return len(s)
}

// continues tells whether a word goes on at the head of s.
func continues(s string) bool {
	r, _ := utf8.DecodeRuneInString(s)
	return len(s) > 0 && (isUnitRune(r) || r == '_' || unicode.IsLetter(r) || unicode.IsDigit(r))
}

// wordRun is the length of the word at the head of s.
func wordRun(s string) int {
	for i := range s {
		if !continues(s[i:]) {
			return i
		}
	}
	return len(s)
}

func isASCIIName(s string) bool {
	for i := range len(s) {
		if !isDigit(s[i]) && !isLetter(s[i]) && s[i] != '_' {
			return false
		}
	}
	return s != ""
}

// longestUnit in bytes: no suffix is as long, so longer runs need no look-up.
const longestUnit = 12

// suffixAt finds the prefix and unit at the head of s, whose first run characters
// a unit may be made of. A pair such as K/W is taken before its first half.
func suffixAt(s string, run int) (written, int, bool) {
	if run == 0 || run > longestUnit {
		return written{}, 0, false
	}
	if run < len(s) && s[run] == '/' {
		pair := run + 1 + unitRun(s[run+1:])
		if pair-run <= longestUnit && !continues(s[pair:]) {
			if w, ok := suffixes[s[:pair]]; ok {
				return w, pair, true
			}
		}
	}
	if continues(s[run:]) {
		return written{}, 0, false
	}
	w, ok := suffixes[s[:run]]
	return w, run, ok
}

// scanSpaced reads on behind a number that ends its word: a unit may follow after
// spaces.
func scanSpaced(text string, n number) (Reading, error) {
	rest := text[n.length:]
	spaces := len(rest) - len(strings.TrimLeft(rest, " \t\u00a0\u202f")) // no-break spaces too
	unit := rest[spaces:]
	run := unitRun(unit)
	if spaces > 0 && run > 0 {
		w, length, ok := suffixAt(unit, run)
		switch {
		case ok && w.bare:
			return Reading{}, &Error{
				Code: "bad-unit", Message: fmt.Sprintf("the prefix %s stands apart from its number, without a unit", unit[:length]),
				Hint: "write " + text[:n.length] + unit[:length], Length: n.length + spaces + length,
			}
		case ok:
			return n.reading(text, w, unit[:length], n.length+spaces+length)
		case isMeg(unit):
			return Reading{}, megError(text, n.length, n.length+spaces+run)
		}
	}
	return n.reading(text, written{bare: true}, "", n.length)
}

// reading makes the value of digits and a suffix.
func (n number) reading(text string, w written, suffix string, length int) (Reading, error) {
	digits := text[:n.length]
	v, err := scale(digits, w.ten)
	if err != nil {
		return Reading{}, &Error{Code: "bad-number", Message: clip(text[:length]) + " is " + err.Error(), Length: length}
	}
	return Reading{
		Quantity: Quantity{v, w.unit}, Length: length, Bare: w.bare, Number: digits, Suffix: suffix,
		Spaced: length > n.length+len(suffix),
	}, nil
}

// scale reads digits × 10^ten, rounded once.
func scale(digits string, ten int) (float64, error) {
	mantissa, exponent := digits, 0
	if i := strings.IndexAny(digits, "eE"); i >= 0 {
		mantissa = digits[:i]
		// Atoi saturates, and adding a prefix to the largest int would wrap.
		exponent, _ = strconv.Atoi(digits[i+1:])
		exponent = max(min(exponent, math.MaxInt32), math.MinInt32)
	}
	exponent += ten
	if exponent != 0 {
		mantissa += "e" + strconv.Itoa(exponent)
	}
	v, err := strconv.ParseFloat(mantissa, 64)
	if err != nil {
		return 0, errors.New("too large a number")
	}
	if v == 0 && strings.ContainsAny(strings.SplitN(mantissa, "e", 2)[0], "123456789") {
		return 0, errors.New("too small a number")
	}
	return v, nil
}

func isMeg(tail string) bool {
	return len(tail) >= 3 && strings.EqualFold(tail[:3], "meg")
}

func megError(text string, number, length int) *Error {
	tail := strings.TrimLeft(text[number:length], " \t")
	after := tail[3:]
	if n := strings.TrimPrefix(strings.ToLower(after), "a"); n == "ohm" || n == "ohms" {
		after = "ohm"
	} else {
		after = ""
	}
	return &Error{
		Code: "bad-unit", Message: fmt.Sprintf("%s is no SI prefix", clip(tail)),
		Hint: "mega is written M: " + text[:number] + "M" + after, Length: length,
	}
}

func unitError(text string, number, length int) *Error {
	e := &Error{
		Code: "bad-unit", Message: fmt.Sprintf("%s has no unit that is known here", clip(text[:length])),
		Hint: likely(text[:length]), Length: length,
	}
	if e.Hint == "" {
		e.Hint = "units are V, A, W, ohm, S, K, degC, eV, %, ppm/K, %/K, mV/K and K/W, with f p n u m k M G before them"
	}
	return e
}

// slips are the words for units that people write, in lower case.
var slips = map[string]string{
	"v": "V", "volt": "V", "volts": "V", "vdc": "V", "a": "A", "amp": "A", "amps": "A", "ampere": "A", "w": "W", "watt": "W", "watts": "W",
	"ohm": "ohm", "ohms": "ohm", "c": "degC", "°": "degC", "degc": "degC", "deg": "degC", "celsius": "degC", "ev": "eV", "ppm": "ppm/K",
	"siemens": "S", "kelvin": "K", "percent": "%",
}

// likelyUnit is the unit with its prefix that a wrong one was meant to be.
func likelyUnit(unit string) (string, bool) {
	if u, ok := slips[strings.ToLower(unit)]; ok {
		return u, true
	}
	for _, p := range prefixes {
		if rest, ok := strings.CutPrefix(unit, p.text); ok {
			if u, ok := slips[strings.ToLower(rest)]; ok && suffixes[p.ascii+u].ascii != "" {
				return p.ascii + u, true
			}
		}
	}
	if rest, ok := strings.CutPrefix(unit, "K"); ok { // kilo is a small k
		if u, ok := slips[strings.ToLower(rest)]; ok && suffixes["k"+u].ascii != "" {
			return "k" + u, true
		}
	}
	return "", false
}

// clip shortens what a message quotes.
func clip(s string) string {
	const most = 40 // characters; a message stays one line
	if utf8.RuneCountInString(s) <= most {
		return s
	}
	return string([]rune(s)[:most]) + "…"
}
