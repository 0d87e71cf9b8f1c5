package revision

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"slices"
	"testing"

	"github.com/go-git/go-git/v5/plumbing"
)

// rawIndex writes a pack index of version 2; an offset past 31 bits goes into
// the table of long ones. The hashes have to be in order.
func rawIndex(hashes []plumbing.Hash, offsets []uint64) []byte {
	var counts [256]uint32
	for _, h := range hashes {
		for i := int(h[0]); i < 256; i++ {
			counts[i]++
		}
	}
	b := []byte("\xfftOc\x00\x00\x00\x02")
	for _, n := range counts {
		b = binary.BigEndian.AppendUint32(b, n)
	}
	for _, h := range hashes {
		b = append(b, h[:]...)
	}
	b = append(b, make([]byte, 4*len(hashes))...)
	var long []byte
	for _, o := range offsets {
		if o <= math.MaxInt32 {
			b = binary.BigEndian.AppendUint32(b, uint32(o))
			continue
		}
		b = binary.BigEndian.AppendUint32(b, 1<<31|uint32(len(long)/8))
		long = binary.BigEndian.AppendUint64(long, o)
	}
	return append(append(b, long...), make([]byte, 2*hashSize)...)
}

// FuzzPackIndex: a search in an index that is in order finds what is in it and
// nothing else; in one that is not it ends, and gives only what stands there.
func FuzzPackIndex(f *testing.F) {
	h := func(first, last byte) (h plumbing.Hash) {
		h[0], h[19] = first, last
		return h
	}
	whole := rawIndex([]plumbing.Hash{h(0, 1), h(0, 2), h(7, 0), h(255, 255)}, []uint64{12, 1 << 33, 500, math.MaxInt64})
	f.Add(whole)
	f.Add(rawIndex(nil, nil))
	f.Add(rawIndex([]plumbing.Hash{h(5, 5)}, []uint64{12}))
	f.Add(whole[:len(whole)-1])
	f.Add(whole[:idxHashes-1])
	damaged := bytes.Clone(whole)
	damaged[8], damaged[8+255*4] = 0x7f, 0xff // counts that do not ascend, a huge number
	f.Add(damaged)
	swapped := bytes.Clone(whole)
	copy(swapped[idxHashes:], h(0, 9).String())
	f.Add(swapped)
	f.Add(make([]byte, 256*4+2*hashSize)) // an empty one of version 1
	f.Fuzz(func(t *testing.T, data []byte) {
		x := &packIndex{r: bytes.NewReader(data), size: int64(len(data))}
		if err := x.readHeader(); err != nil {
			return
		}
		count := x.count()
		if count > int64(len(data))/(hashSize+8) {
			t.Fatalf("%d objects in %d bytes", count, len(data))
		}
		var all []plumbing.Hash
		ordered := true
		for i := range count {
			at, err := x.hashAt(i)
			if err != nil {
				t.Fatal(err)
			}
			low, high := x.bucket(at[0])
			ordered = ordered && low <= i && i < high && (i == 0 || bytes.Compare(all[i-1][:], at[:]) < 0)
			all = append(all, at)
		}
		asked := append(slices.Clone(all), plumbing.ZeroHash, h(255, 255), h(5, 5))
		for _, want := range asked {
			offset, ok, err := x.offset(want)
			place := slices.Index(all, want)
			if ordered && err == nil && ok != (place >= 0) || ok && (err != nil || place < 0 || offset < 0) {
				t.Fatalf("%s, at %d: offset %d, %v, %v", want, place, offset, ok, err)
			}
			if ok && ordered {
				raw := data[idxHashes+count*(hashSize+4)+int64(place)*4:]
				if short := binary.BigEndian.Uint32(raw); short>>31 == 0 && offset != int64(short) {
					t.Fatalf("%s: offset %d, want %d", want, offset, short)
				}
			}
			for _, digits := range []int{1, 4, 7, 40} {
				var found, expected []plumbing.Hash
				prefix := want
				for i := range prefix {
					if 2*i >= digits {
						prefix[i] = 0
					} else if 2*i+1 == digits {
						prefix[i] &= 0xf0
					}
				}
				if err := x.withPrefix(prefix, digits, func(h plumbing.Hash) { found = append(found, h) }); err != nil {
					t.Fatal(err)
				}
				for _, at := range all {
					if fmt.Sprint(at)[:digits] == fmt.Sprint(want)[:digits] {
						expected = append(expected, at)
					}
				}
				if ordered && !slices.Equal(found, expected) {
					t.Fatalf("with %d digits of %s: %v, want %v", digits, want, found, expected)
				}
			}
		}
	})
}

// packOf writes a pack of entries: type, content and, for a difference, what
// comes before it. It gives the offsets too.
func packOf(entries ...[]byte) (data []byte, offsets []int64) {
	data = binary.BigEndian.AppendUint32([]byte("PACK\x00\x00\x00\x02"), uint32(len(entries)))
	for _, e := range entries {
		offsets = append(offsets, int64(len(data)))
		data = append(data, e...)
	}
	return append(data, make([]byte, hashSize)...), offsets
}

// packed writes one entry of a pack, its recorded size given.
func packed(kind plumbing.ObjectType, size int, reference, content []byte) []byte {
	b := []byte{byte(kind)<<4 | byte(size&15)}
	for size >>= 4; size > 0; size >>= 7 {
		b[len(b)-1] |= 0x80
		b = append(b, byte(size&0x7f))
	}
	return append(append(b, reference...), deflate(string(content))...)
}

// FuzzPack reads at an offset of a pack: the two ways to look at an object agree
// on its type and size, and what is recorded is not believed.
func FuzzPack(f *testing.F) {
	base := packed(plumbing.BlobObject, 6, nil, []byte("base\n\n"))
	delta := []byte{6, 9, 0x90, 5, 4, 'm', 'o', 'r', 'e'} // copy 5 bytes, then add 4
	data, at := packOf(base, packed(plumbing.OFSDeltaObject, len(delta), []byte{byte(len(base))}, delta))
	f.Add(data, at[0])
	f.Add(data, at[1])
	hash := plumbing.NewHash(sumOf("blob", "base\n\n"))
	data, at = packOf(base, packed(plumbing.REFDeltaObject, len(delta), hash[:], delta))
	f.Add(data, at[1])
	f.Add(data, int64(len(data)))
	f.Add(data, int64(-1))
	itself, at := packOf(packed(plumbing.OFSDeltaObject, 2, []byte{0}, []byte{0, 0}))
	f.Add(itself, at[0])
	for _, claim := range []int{5, 7, 1 << 30, 1 << 53} {
		data, at = packOf(packed(plumbing.BlobObject, claim, nil, []byte("base\n\n")))
		f.Add(data, at[0])
	}
	huge := binary.AppendUvarint(binary.AppendUvarint(nil, 6), 1<<62)
	data, at = packOf(base, packed(plumbing.OFSDeltaObject, len(huge), []byte{byte(len(base))}, huge))
	f.Add(data, at[1])
	large := binary.AppendUvarint(binary.AppendUvarint(nil, 6), maxRebuilt)
	data, at = packOf(base, packed(plumbing.OFSDeltaObject, len(large), []byte{byte(len(base))}, large))
	f.Add(data, at[1])
	f.Fuzz(func(t *testing.T, data []byte, offset int64) {
		if offset < 0 || offset > int64(len(data)) {
			t.Skip("no offset of it")
		}
		// Every entry that the fuzzer may refer to by its hash is the first one.
		index := &packIndex{r: bytes.NewReader(rawIndex([]plumbing.Hash{hash}, []uint64{12}))}
		index.size = int64(index.r.(*bytes.Reader).Len())
		if err := index.readHeader(); err != nil {
			t.Fatal(err)
		}
		p := &pack{name: "fuzz", index: index}
		r := bytes.NewReader(data)
		kind, size, err := p.describe(r, offset)
		cache := newBaseCache()
		kind2, content, err2 := p.read(r, offset, cache)
		if err2 != nil {
			return
		}
		if err != nil || kind != kind2 || size != int64(len(content)) {
			t.Fatalf("described as %s of %d bytes (%v), read as %s of %d", kind, size, err, kind2, len(content))
		}
		kind3, again, err := p.read(r, offset, cache)
		if err != nil || kind3 != kind2 || !bytes.Equal(again, content) {
			t.Fatalf("from the cache it is another one, %v", err)
		}
	})
}
