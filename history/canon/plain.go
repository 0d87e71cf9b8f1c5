package canon

import (
	"bytes"
	"unicode/utf8"
)

// mostDepth bounds how deep plainly follows a value.
const mostDepth = 100

// plainly proves at the speed of reading that bytes are canonical JSON of the
// form that bodies have: texts, whole numbers below 2^53, names of ASCII
// characters without escapes. False says nothing: Check then asks the library.
func plainly(body []byte) bool {
	rest, ok := value(body, 0)
	return ok && len(rest) == 0
}

// value passes over a value and gives what follows it.
func value(b []byte, depth int) (rest []byte, ok bool) {
	if len(b) == 0 || depth >= mostDepth {
		return nil, false
	}
	switch b[0] {
	case '"':
		_, rest, ok = text(b)
		return rest, ok
	case '{':
		return object(b[1:], depth+1)
	case '[':
		return array(b[1:], depth+1)
	case 't':
		return bytes.CutPrefix(b, []byte("true"))
	case 'f':
		return bytes.CutPrefix(b, []byte("false"))
	case 'n':
		return bytes.CutPrefix(b, []byte("null"))
	}
	return whole(b)
}

// object passes over the members of an object. RFC 8785, 3.2.3: names stand in
// the order of UTF-16 code units, which for ASCII is that of bytes; a name that
// came before would not be in order.
func object(b []byte, depth int) (rest []byte, ok bool) {
	if len(b) > 0 && b[0] == '}' {
		return b[1:], true
	}
	var last []byte
	for first := true; ; first = false {
		name, after, ok := text(b)
		if !ok || bytes.IndexByte(name, '\\') >= 0 || !ascii(name) || !first && bytes.Compare(last, name) >= 0 {
			return nil, false
		}
		if last = name; len(after) == 0 || after[0] != ':' {
			return nil, false
		}
		if b, ok = value(after[1:], depth); !ok || len(b) == 0 {
			return nil, false
		}
		switch b[0] {
		case '}':
			return b[1:], true
		case ',':
			b = b[1:]
		default:
			return nil, false
		}
	}
}

// array passes over the elements of an array.
func array(b []byte, depth int) (rest []byte, ok bool) {
	if len(b) > 0 && b[0] == ']' {
		return b[1:], true
	}
	for {
		if b, ok = value(b, depth); !ok || len(b) == 0 {
			return nil, false
		}
		switch b[0] {
		case ']':
			return b[1:], true
		case ',':
			b = b[1:]
		default:
			return nil, false
		}
	}
}

// text passes over a text and gives what stands between its quotes. RFC 8785,
// 3.2.2.2: only what must be escaped is, and in one way.
func text(b []byte) (inner, rest []byte, ok bool) {
	if len(b) == 0 || b[0] != '"' {
		return nil, nil, false
	}
	plain := true
	for i := 1; i < len(b); i++ {
		switch c := b[i]; {
		case c == '"':
			inner = b[1:i]
			return inner, b[i+1:], plain || utf8.Valid(inner)
		case c == '\\':
			n := escape(b[i+1:])
			if n == 0 {
				return nil, nil, false
			}
			i += n
		case c < ' ':
			return nil, nil, false
		case c >= utf8.RuneSelf:
			plain = false
		}
	}
	return nil, nil, false
}

// escape gives the length of what follows a backslash, 0 where it is not the one
// way to write its character.
func escape(b []byte) int {
	if len(b) == 0 {
		return 0
	}
	if b[0] != 'u' {
		if bytes.IndexByte([]byte(`"\bfnrt`), b[0]) < 0 {
			return 0
		}
		return 1
	}
	// Control codes without a letter of their own, in lower case.
	if len(b) < 5 || b[1] != '0' || b[2] != '0' || b[3] != '0' && b[3] != '1' {
		return 0
	}
	var low byte
	switch c := b[4]; {
	case '0' <= c && c <= '9':
		low = c - '0'
	case 'a' <= c && c <= 'f':
		low = c - 'a' + 10
	default:
		return 0
	}
	switch (b[3]-'0')<<4 | low {
	case '\b', '\t', '\n', '\f', '\r':
		return 0
	}
	return 5
}

// whole passes over a whole number of at most 15 digits, which is below 2^53.
func whole(b []byte) (rest []byte, ok bool) {
	n := 0
	if b[0] == '-' {
		n = 1
	}
	digits := b[n:]
	k := 0
	for k < len(digits) && '0' <= digits[k] && digits[k] <= '9' {
		k++
	}
	if k == 0 || k > 15 || digits[0] == '0' && (k > 1 || n > 0) {
		return nil, false
	}
	// A fraction or an exponent follows no value and is refused there.
	return digits[k:], true
}

func ascii(b []byte) bool {
	for _, c := range b {
		if c >= utf8.RuneSelf {
			return false
		}
	}
	return true
}
