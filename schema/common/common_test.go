package common

import (
	"bytes"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// Law: what is counted is equal, and the next bytes, if both texts have one, are
// not.
func TestStartAndEnd(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		text := func(name string, most int) []byte {
			return rapid.SliceOfN(rapid.SampledFrom([]byte("ab")), 0, most).Draw(t, name)
		}
		head, tail := text("head", 300), text("tail", 300)
		a := slices.Concat(head, text("a", 4), tail)
		b := slices.Concat(head, text("b", 4), tail)
		n := Start(a, b)
		if n < len(head) || !bytes.Equal(a[:n], b[:n]) || n < min(len(a), len(b)) && a[n] == b[n] {
			t.Fatalf("Start(%q, %q) = %d", a, b, n)
		}
		n = End(a, b)
		if n < len(tail) || !bytes.HasSuffix(a, b[len(b)-n:]) || n < min(len(a), len(b)) && a[len(a)-1-n] == b[len(b)-1-n] {
			t.Fatalf("End(%q, %q) = %d", a, b, n)
		}
	})
}
