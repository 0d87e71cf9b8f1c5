package source

import (
	"fmt"
	"io"
	"unicode/utf16"
	"unicode/utf8"
)

// InertJSON gives a writer of JSON text that escapes, as JSON allows in strings,
// what a terminal could obey or a reader could not see: DEL and the C1 control
// codes, marks that turn the direction of text, and marks without a width. The
// JSON means the same.
func InertJSON(w io.Writer) io.Writer { return &inert{w: w} }

type inert struct {
	w    io.Writer
	rest []byte // the begun bytes of a character
	out  []byte
}

// Write writes all but a character at the end that is not yet complete.
func (i *inert) Write(p []byte) (int, error) {
	in := append(i.rest, p...)
	i.out = i.out[:0]
	at := 0
	for at < len(in) {
		if c := in[at]; c < 0x7f {
			i.out = append(i.out, c)
			at++
			continue
		}
		if !utf8.FullRune(in[at:]) {
			break
		}
		r, size := utf8.DecodeRune(in[at:])
		switch {
		case seen(r) || r == utf8.RuneError:
			i.out = append(i.out, in[at:at+size]...)
		case r > 0xffff:
			high, low := utf16.EncodeRune(r)
			i.out = fmt.Appendf(i.out, `\u%04x\u%04x`, high, low)
		default:
			i.out = fmt.Appendf(i.out, `\u%04x`, r)
		}
		at += size
	}
	i.rest = append([]byte(nil), in[at:]...)
	if _, err := i.w.Write(i.out); err != nil {
		return 0, err
	}
	return len(p), nil
}
