package render

import (
	"bytes"
	"io"
	"strings"
)

// WriteJSON writes v as JSON laid out for reading: an object or array that holds
// no other and fits the line stands on one line.
func WriteJSON(w io.Writer, v any) error {
	b, err := marshal(v)
	if err != nil {
		return err
	}
	var out bytes.Buffer
	layOut(&out, b, 0)
	out.WriteByte('\n')
	_, err = w.Write(out.Bytes())
	return err
}

// inlineMost is the longest line that an object may take: a transistor's eight
// members with all their digits.
const inlineMost = 240

// layOut writes the value at the start of b, which is compact JSON, at that depth
// and returns what follows it.
func layOut(out *bytes.Buffer, b []byte, depth int) []byte {
	if b[0] != '{' && b[0] != '[' {
		n := scalar(b)
		out.Write(b[:n])
		return b[n:]
	}
	if n, ok := simple(b); ok && n+2*depth < inlineMost {
		return inline(out, b)
	}
	closing := b[0] + 2 // in ASCII, } and ] stand two behind { and [
	out.WriteByte(b[0])
	b = b[1:]
	for b[0] != closing {
		if b[0] == ',' {
			out.WriteByte(',')
			b = b[1:]
		}
		out.WriteString("\n" + strings.Repeat("  ", depth+1))
		if closing == '}' {
			n := scalar(b)
			out.Write(b[:n])
			out.WriteString(": ")
			b = b[n+1:]
		}
		b = layOut(out, b, depth+1)
	}
	out.WriteString("\n" + strings.Repeat("  ", depth))
	out.WriteByte(closing)
	return b[1:]
}

// simple gives the length of the object or array at the start of b, and whether
// it holds no other.
func simple(b []byte) (int, bool) {
	for i := 1; i < len(b); {
		switch b[i] {
		case '{', '[':
			return 0, false
		case '}', ']':
			return i + 1, true
		case ',', ':':
			i++
		default:
			i += scalar(b[i:])
		}
	}
	return 0, false
}

// inline writes a simple object or array on one line.
func inline(out *bytes.Buffer, b []byte) []byte {
	out.WriteByte(b[0])
	for i := 1; ; {
		switch b[i] {
		case '}', ']':
			out.WriteByte(b[i])
			return b[i+1:]
		case ',', ':':
			out.WriteByte(b[i])
			out.WriteByte(' ')
			i++
		default:
			n := scalar(b[i:])
			out.Write(b[i : i+n])
			i += n
		}
	}
}

// scalar gives the length of the string, number or word at the start of b.
func scalar(b []byte) int {
	if b[0] != '"' {
		if n := bytes.IndexAny(b, ",:}]"); n >= 0 {
			return n
		}
		return len(b)
	}
	for i := 1; i < len(b); i++ {
		switch b[i] {
		case '\\':
			i++
		case '"':
			return i + 1
		}
	}
	return len(b)
}
