package revision

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"os"
	"sync"
	"sync/atomic"

	"github.com/go-git/go-git/v5/plumbing"
)

// packIndex finds objects in a pack by its index file, version 2
// (gitformat-pack(5)): 8 bytes of magic and version, 256 counts of the hashes
// whose first byte is at most the position, the hashes in order, their CRCs,
// their offsets in 4 bytes, and the offsets that need 8.
//
// Nothing of the index is trusted: an object is checked against its hash when it
// is read, so a wrong offset is found out.
type packIndex struct {
	r      io.ReaderAt
	closer io.Closer
	data   atomic.Pointer[[]byte] // all of it, once that was read
	asked  atomic.Int32
	whole  sync.Once
	size   int64
	fanout [256]uint32
}

const (
	idxHashes = 8 + 256*4 // where the hashes begin
	hashSize  = 20

	// A small index is read at once. Of a larger one only the parts that are asked
	// for are read, and the whole once many were, if it is not too large.
	smallIdx       = 256 << 10
	maxIdxInMemory = 8 << 20
	fewSearches    = 64
)

func openIndex(name string) (*packIndex, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	info, err := f.Stat()
	if err != nil {
		f.Close()
		return nil, err
	}
	idx := &packIndex{r: f, closer: f, size: info.Size()}
	if idx.size <= smallIdx {
		data := make([]byte, idx.size)
		_, err := io.ReadFull(f, data)
		f.Close()
		if err != nil {
			return nil, err
		}
		idx.r, idx.closer = bytes.NewReader(data), nil
		idx.data.Store(&data)
	}
	if err := idx.readHeader(); err != nil {
		idx.close()
		return nil, fmt.Errorf("pack index %q: %w", name, err)
	}
	return idx, nil
}

func (x *packIndex) close() {
	if x.closer != nil {
		x.closer.Close()
	}
}

func (x *packIndex) readHeader() error {
	var head [idxHashes]byte
	if _, err := x.r.ReadAt(head[:], 0); err != nil {
		return errors.New("cut short")
	}
	if !bytes.Equal(head[:8], []byte("\xfftOc\x00\x00\x00\x02")) {
		if x.old(head[:256*4]) {
			return errOldIndex
		}
		return errors.New("does not begin as one of version 2")
	}
	last := uint32(0)
	for i := range x.fanout {
		x.fanout[i] = binary.BigEndian.Uint32(head[8+4*i:])
		if x.fanout[i] < last {
			return errors.New("counts do not ascend")
		}
		last = x.fanout[i]
	}
	// For each object a hash, a CRC and an offset, then two checksums.
	if x.size < idxHashes+int64(last)*(hashSize+8)+2*hashSize {
		return errors.New("cut short")
	}
	return nil
}

var errOldIndex = errors.New("is of version 1, only version 2 is supported")

// old tells whether a file is an index of version 1: that begins with the 256
// counts, then come for each object an offset and a hash, then two checksums.
func (x *packIndex) old(counts []byte) bool {
	last := uint32(0)
	for i := 0; i < len(counts); i += 4 {
		n := binary.BigEndian.Uint32(counts[i:])
		if n < last {
			return false
		}
		last = n
	}
	return x.size == 256*4+int64(last)*(4+hashSize)+2*hashSize
}

func (x *packIndex) count() int64 { return int64(x.fanout[255]) }

// bucket gives the positions [low, high) of the hashes with a first byte.
func (x *packIndex) bucket(first byte) (low, high int64) {
	if first > 0 {
		low = int64(x.fanout[first-1])
	}
	return low, int64(x.fanout[first])
}

func (x *packIndex) hashAt(i int64) (plumbing.Hash, error) {
	var h plumbing.Hash
	return h, x.readAt(h[:], idxHashes+i*hashSize)
}

// inMemory gives the whole index, where it is in memory; nil where it is not.
func (x *packIndex) inMemory() []byte {
	if data := x.data.Load(); data != nil {
		return *data
	}
	if x.size > maxIdxInMemory || x.asked.Add(1) <= fewSearches {
		return nil
	}
	x.whole.Do(func() {
		data := make([]byte, x.size)
		if n, err := x.r.ReadAt(data, 0); n == len(data) && (err == nil || err == io.EOF) {
			x.data.Store(&data)
		}
	})
	if data := x.data.Load(); data != nil {
		return *data
	}
	return nil
}

func (x *packIndex) readAt(b []byte, at int64) error {
	if data := x.data.Load(); data != nil && at >= 0 && at+int64(len(b)) <= int64(len(*data)) {
		copy(b, (*data)[at:])
		return nil
	}
	_, err := x.r.ReadAt(b, at)
	return err
}

// search gives the position of the first hash that is not below h.
func (x *packIndex) search(h plumbing.Hash) (int64, error) {
	if data := x.inMemory(); data != nil {
		return x.searchIn(data, h), nil
	}
	low, high := x.bucket(h[0])
	for low < high {
		mid := (low + high) / 2
		at, err := x.hashAt(mid)
		if err != nil {
			return 0, err
		}
		if bytes.Compare(at[:], h[:]) < 0 {
			low = mid + 1
		} else {
			high = mid
		}
	}
	return low, nil
}

// searchIn is search in the whole index.
func (x *packIndex) searchIn(data []byte, h plumbing.Hash) int64 {
	low, high := x.bucket(h[0])
	for low < high {
		mid := (low + high) / 2
		at := idxHashes + mid*hashSize
		if bytes.Compare(data[at:at+hashSize], h[:]) < 0 {
			low = mid + 1
		} else {
			high = mid
		}
	}
	return low
}

// offset gives where in the pack an object begins.
func (x *packIndex) offset(h plumbing.Hash) (offset int64, ok bool, err error) {
	if data := x.inMemory(); data != nil {
		// Most objects of many packs are not in this one.
		i := x.searchIn(data, h)
		if at := idxHashes + i*hashSize; i >= x.count() || !bytes.Equal(data[at:at+hashSize], h[:]) {
			return 0, false, nil
		}
		return x.offsetAt(i, func(at int64) ([]byte, error) {
			if at > int64(len(data))-8 {
				return nil, io.ErrUnexpectedEOF
			}
			return data[at:], nil
		})
	}
	i, err := x.search(h)
	if err != nil || i >= x.count() {
		return 0, false, err
	}
	if at, err := x.hashAt(i); err != nil || at != h {
		return 0, false, err
	}
	return x.offsetAt(i, func(at int64) ([]byte, error) {
		b := make([]byte, 8)
		return b, x.readAt(b, at)
	})
}

// offsetAt reads the offset at a position; read gives 8 bytes from a place on,
// which two checksums follow.
func (x *packIndex) offsetAt(i int64, read func(at int64) ([]byte, error)) (offset int64, ok bool, err error) {
	offsets := idxHashes + x.count()*(hashSize+4)
	b, err := read(offsets + i*4)
	if err != nil {
		return 0, false, err
	}
	short := binary.BigEndian.Uint32(b)
	if short>>31 == 0 {
		return int64(short), true, nil
	}
	if b, err = read(offsets + x.count()*4 + int64(short&^(1<<31))*8); err != nil {
		return 0, false, err
	}
	return int64(binary.BigEndian.Uint64(b) &^ (1 << 63)), true, nil
}

// withPrefix calls fn for each hash that begins with the first digits half bytes
// of prefix.
func (x *packIndex) withPrefix(prefix plumbing.Hash, digits int, fn func(plumbing.Hash)) error {
	i, err := x.search(prefix)
	if err != nil {
		return err
	}
	for ; i < x.count(); i++ {
		h, err := x.hashAt(i)
		if err != nil {
			return err
		}
		if !hasPrefix(h, prefix, digits) {
			return nil
		}
		fn(h)
	}
	return nil
}

func hasPrefix(h, prefix plumbing.Hash, digits int) bool {
	n := digits / 2
	if !bytes.Equal(h[:n], prefix[:n]) {
		return false
	}
	return digits%2 == 0 || h[n]>>4 == prefix[n]>>4
}
