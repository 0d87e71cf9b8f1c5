package revision

import (
	"bytes"
	"errors"
	"testing"

	"github.com/go-git/go-git/v5/plumbing"
)

func joinBytes(parts ...[]byte) []byte { return bytes.Join(parts, nil) }

// The head of an entry, by gitformat-pack(5): the kind and the size, then where the base
// of a difference is. What cannot be is refused, and so is what is cut short.
func TestParsePackEntry(t *testing.T) {
	ff := func(n int) []byte { return bytes.Repeat([]byte{0xff}, n) }
	hash := bytes.Repeat([]byte{0xab}, hashSize)
	const at = 200
	for _, c := range []struct {
		name string
		head []byte
		want packEntry // the zero entry: refused
	}{
		{"nothing", nil, packEntry{}},
		{"empty", []byte{0x30}, packEntry{kind: plumbing.BlobObject, data: at + 1}},
		{"size in one byte", []byte{0x3f}, packEntry{kind: plumbing.BlobObject, size: 15, data: at + 1}},
		{"size in two", []byte{0x95, 0x01}, packEntry{kind: plumbing.CommitObject, size: 21, data: at + 2}},
		{"size that is cut short", []byte{0x95}, packEntry{}},
		{"longest size", joinBytes([]byte{0xbf}, ff(7), []byte{0x7f}), packEntry{kind: plumbing.BlobObject, size: 1<<60 - 1, data: at + 9}},
		{"longer size", joinBytes([]byte{0xbf}, ff(8), []byte{0x7f}), packEntry{}},
		{"size without an end", joinBytes([]byte{0xbf}, ff(29)), packEntry{}},
		{"kind 0", []byte{0x01}, packEntry{}},
		{"kind 5", []byte{0x51}, packEntry{}},
		{"base before", []byte{0x62, 10}, packEntry{kind: plumbing.OFSDeltaObject, size: 2, offset: at - 10, data: at + 2}},
		{"base at its own place", []byte{0x62, 0}, packEntry{}},
		{"base further back, in two bytes", []byte{0x62, 0x80, 0}, packEntry{kind: plumbing.OFSDeltaObject, size: 2, offset: at - 128, data: at + 3}},
		{"first base there can be", []byte{0x62, 0x80, at - 129}, packEntry{kind: plumbing.OFSDeltaObject, size: 2, offset: 1, data: at + 3}},
		{"base at the beginning of the file", []byte{0x62, 0x80, at - 128}, packEntry{}},
		{"base before the beginning", []byte{0x62, 0x81, 0}, packEntry{}},
		{"offset that is cut short", []byte{0x62, 0x80}, packEntry{}},
		{"no offset", []byte{0x62}, packEntry{}},
		// 2^64 + 10, which 64 bits would take for 10.
		{"offset past 64 bits", []byte{0x62, 0x80, 0xfe, 0xfe, 0xfe, 0xfe, 0xfe, 0xfe, 0xfe, 0xff, 0x0a}, packEntry{}},
		{"base by its hash", joinBytes([]byte{0x72}, hash), packEntry{kind: plumbing.REFDeltaObject, size: 2, base: plumbing.Hash(hash), data: at + 21}},
		{"hash that is cut short", joinBytes([]byte{0x72}, hash[1:]), packEntry{}},
	} {
		got, err := parsePackEntry(c.head, at)
		if refused := c.want == (packEntry{}); (err != nil) != refused || !refused && got != c.want {
			t.Errorf("%s: %+v, %v, want %+v", c.name, got, err, c.want)
		}
	}
}

// What is described is the object that is read, at the end of a pack, too; what cannot
// be read is not described.
func TestDescribeEntry(t *testing.T) {
	hash := plumbing.NewHash(sumOf("blob", "base\n\n"))
	index := &packIndex{r: bytes.NewReader(rawIndex([]plumbing.Hash{hash}, []uint64{12}))}
	index.size = int64(index.r.(*bytes.Reader).Len())
	if err := index.readHeader(); err != nil {
		t.Fatal(err)
	}
	p := &pack{name: "p", index: index}
	base := packed(plumbing.BlobObject, 6, nil, []byte("base\n\n"))
	delta := []byte{6, 9, 0x90, 5, 4, 'm', 'o', 'r', 'e'}
	onBase := func(content []byte) []byte {
		return packed(plumbing.OFSDeltaObject, len(content), []byte{byte(len(base))}, content)
	}
	endless := bytes.Repeat([]byte{0xff}, 12)
	for _, c := range []struct {
		name   string
		first  []byte
		second []byte // empty: the first is described
		size   int64  // -1: an error
	}{
		{"an object", base, nil, 6},
		{"an empty object at the end", base, packed(plumbing.BlobObject, 0, nil, nil), 0},
		{"a difference", base, onBase(delta), 9},
		{"a kind that there is not", []byte{0x51}, nil, -1},
		{"a difference of what cannot be read", []byte{0x51}, packed(plumbing.OFSDeltaObject, len(delta), []byte{1}, delta), -1},
		{"a difference without sizes", base, onBase(nil), -1},
		{"a difference of one size", base, onBase([]byte{6}), -1},
		{"a difference whose size does not end", base, onBase(endless), -1},
		{"another one", base, onBase(append([]byte{6}, endless...)), -1},
		{"a difference of itself", packed(plumbing.REFDeltaObject, len(delta), hash[:], delta), nil, -1},
	} {
		data, at := packOf(c.first, c.second)
		offset := at[0]
		if len(c.second) > 0 {
			offset = at[1]
		}
		kind, size, err := p.describe(bytes.NewReader(data), offset)
		if c.size < 0 {
			if err == nil {
				t.Errorf("%s: described as %s of %d bytes", c.name, kind, size)
			}
		} else if err != nil || kind != plumbing.BlobObject || size != c.size {
			t.Errorf("%s: %s of %d bytes, %v, want %d", c.name, kind, size, err, c.size)
		}
		if _, content, err := p.read(bytes.NewReader(data), offset, newBaseCache()); (err != nil) != (c.size < 0) || int64(len(content)) != max(0, c.size) {
			t.Errorf("%s: read as %q, %v", c.name, content, err)
		}
	}
}

// A limit is one of the object, whatever its bytes would mean as a difference.
func TestReadAtMost(t *testing.T) {
	like := bytes.Repeat([]byte{0xff, 0xff, 0xff, 0x07}, 2) // sizes of millions, in a difference
	base := packed(plumbing.BlobObject, 8, nil, like)
	longer := []byte{8, 9, 0x90, 8, 1, 'x'}
	data, at := packOf(base, packed(plumbing.OFSDeltaObject, len(longer), []byte{byte(len(base))}, longer))
	for i, size := range []int64{8, 9} {
		for limit, want := range map[int64]error{size: nil, size + 1: nil, size - 1: errLong} {
			p := &pack{name: "p", index: &packIndex{}}
			_, content, err := p.readAtMost(bytes.NewReader(data), at[i], limit, newBaseCache(), nil)
			if !errors.Is(err, want) || want == nil && int64(len(content)) != size {
				t.Errorf("%d bytes of at most %d: %q, %v", size, limit, content, err)
			}
		}
	}
}
