package quantity

// Letters of IEC 60062 that stand for the decimal point of a resistance, with the
// power of ten that they carry. A small k is common practice.
var codeLetters = map[byte]int{'R': 0, 'k': 3, 'K': 3, 'M': 6, 'G': 9}

// scanCode reads 4k7, 1M5 and 100R, whose leading digits are n.
func scanCode(text string, n number) (Reading, bool) {
	if !n.plain || n.length >= len(text) {
		return Reading{}, false
	}
	letter := text[n.length]
	ten, ok := codeLetters[letter]
	end := digits(text, n.length+1)
	if !ok || continues(text[end:]) || end == n.length+1 && letter != 'R' {
		return Reading{}, false
	}
	return codeReading(text[:n.length], text[n.length+1:end], ten, text[:end])
}

// ScanCode reads the whole of a word as a code that begins with its letter: R22
// is 0.22 ohm, K47 470 ohm, M10 100 kohm. Such a word is a name as well.
func ScanCode(word string) (Reading, bool) {
	if len(word) < 2 || digits(word, 1) != len(word) {
		return Reading{}, false
	}
	switch word[0] {
	case 'R', 'K', 'M':
		return codeReading("0", word[1:], codeLetters[word[0]], word)
	}
	return Reading{}, false
}

func codeReading(whole, fraction string, ten int, text string) (Reading, bool) {
	mantissa := whole
	if fraction != "" {
		mantissa += "." + fraction
	}
	v, err := scale(mantissa, ten)
	if err != nil {
		return Reading{}, false
	}
	return Reading{Quantity: Quantity{v, Ohm}, Length: len(text), Number: text, Code: true}, true
}
