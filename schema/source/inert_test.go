package source

import (
	"bytes"
	"encoding/json"
	"io"
	"testing"
	"testing/iotest"
	"unicode"
)

// Whatever the text and however it is cut, the JSON means the same and holds
// nothing but what prints.
func TestInertJSON(t *testing.T) {
	for _, s := range []string{"", "plain", "\x7f", "\u0085 \u009b31m", "a\u202eb\u200b", "ä 日 😀", "\U000e0041", "\u2028", "\ufffd", "\ufeff", "\u00a0", "BW1\ufe0f\U000e0100"} {
		text, err := json.Marshal(map[string]string{"k": s})
		if err != nil {
			t.Fatal(err)
		}
		for _, cut := range []func(io.Reader) io.Reader{iotest.OneByteReader, iotest.HalfReader, func(r io.Reader) io.Reader { return r }} {
			var b bytes.Buffer
			if _, err := io.Copy(InertJSON(&b), cut(bytes.NewReader(text))); err != nil {
				t.Fatal(err)
			}
			for _, r := range b.String() {
				if !unicode.IsPrint(r) || Blank(r) {
					t.Errorf("%q: %U is left", s, r)
				}
			}
			var back map[string]string
			if err := json.Unmarshal(b.Bytes(), &back); err != nil || back["k"] != s {
				t.Errorf("%q became %q, %v", s, back["k"], err)
			}
		}
	}
}
