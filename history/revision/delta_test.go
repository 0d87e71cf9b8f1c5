package revision

import (
	"bytes"
	"testing"

	"github.com/go-git/go-git/v5/plumbing/format/packfile"
)

// FuzzDelta holds applyDelta against the library's way of doing the same.
func FuzzDelta(f *testing.F) {
	base := []byte("0123456789abcdef")
	for _, now := range []string{
		"0123456789abcdef", "0123456789Abcdef", "0123456789abcde", "x0123456789abcdef", "89abcdef01234567", "", "0",
	} {
		f.Add(base, packfile.DiffDelta(base, []byte(now)))
	}
	f.Add(base, []byte{16, 4, 0x90, 4})          // copies what its end is not
	f.Add(base, []byte{16, 4, 0x91, 13, 4})      // past the end of the base
	f.Add(base, []byte{16, 4, 0x91, 12, 4, 0})   // an operation that there is not
	f.Add(base, []byte{16, 4, 0x91, 12})         // cut short
	f.Add(base, []byte{16, 4, 5, 'a', 'b'})      // the same
	f.Add(base, []byte{16, 2, 3, 'a', 'b', 'c'}) // more than was said
	f.Add(base, []byte{15, 2, 2, 'a', 'b'})      // of another base
	f.Add(base, []byte{16, 16, 0x90, 8, 0x90, 8})
	for _, short := range cutShort {
		f.Add(base, short)
		f.Add([]byte{}, short)
	}
	f.Fuzz(sameAsLibrary)
}

// cutShort are differences whose sizes do not end, or are too large for a number.
var cutShort = [][]byte{
	{}, {0x90}, {16}, {16, 0x80}, {0}, {0, 0x80}, bytes.Repeat([]byte{0xff}, 11), append([]byte{16}, bytes.Repeat([]byte{0xff}, 11)...),
}

// A difference without its sizes makes nothing, and not an empty object.
func TestDeltaCutShort(t *testing.T) {
	for _, base := range [][]byte{[]byte("0123456789abcdef"), {}} {
		for _, short := range cutShort {
			if out, err := applyDelta(base, short); err == nil {
				t.Errorf("%x makes %q of %q", short, out, base)
			}
		}
	}
	// What lies behind a difference in memory is no part of it.
	buffer := []byte{16, 4, 4, 'a', 'b', 'c', 'd'}
	if out, err := applyDelta([]byte("0123456789abcdef"), buffer[:5]); err == nil {
		t.Errorf("a piece that is cut short makes %q", out)
	}
	if out, err := applyDelta([]byte("0123456789abcdef"), []byte{16, 0}); err != nil || len(out) != 0 {
		t.Errorf("an empty object: %q, %v", out, err)
	}
}

// Long objects are more than a fuzzer gets through.
func TestLongDelta(t *testing.T) {
	long := bytes.Repeat([]byte("a line of a table,"), 5000)
	changed := bytes.Clone(long)
	changed[70_000] = 'X'
	sameAsLibrary(t, long, packfile.DiffDelta(long, changed))
	sameAsLibrary(t, long, packfile.DiffDelta(changed, append(changed, changed...)))
	whole := []byte{0x90, 0xbf, 5, 0x80, 0x80, 4, 0x80} // 65,536 bytes, where no length is given
	sameAsLibrary(t, long, whole)
	if out, err := applyDelta(long, whole); err != nil || len(out) != 1<<16 {
		t.Errorf("%d bytes, %v", len(out), err)
	}
}

func sameAsLibrary(t *testing.T, base, delta []byte) {
	t.Helper()
	before := bytes.Clone(base)
	want, wantErr := packfile.PatchDelta(base, delta)
	got, err := applyDelta(base, delta)
	if !bytes.Equal(base, before) {
		t.Fatal("the base was written to")
	}
	if err != nil && len(got) > 0 {
		t.Fatal("a failure gives bytes")
	}
	if deltaSize(delta) < 0 {
		if err == nil {
			t.Fatal("a size that is none is taken") // the library takes some that are cut short
		}
		return
	}
	if wantErr == nil && (err != nil || !bytes.Equal(got, want)) {
		t.Fatalf("%q (%v), the library makes %q", got, err, want)
	}
	// The library asks for a longer difference and a base with bytes, and believes
	// any size.
	if err == nil && wantErr != nil && len(base) > 0 && len(delta) >= 4 {
		t.Fatalf("%q, the library refuses: %v", got, wantErr)
	}
}
