package revision

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"sync"

	"github.com/go-git/go-git/v5/plumbing"
)

const (
	// maxChain bounds how many differences lie between an object and its base;
	// git itself allows 4095.
	maxChain = 4095

	// maxRebuilt bounds the size in bytes of an object that is stored as a
	// difference, as it is put together in memory. git stores nothing above
	// core.bigFileThreshold, by default 512 MiB, in this way.
	maxRebuilt = 512 << 20
)

// pack is one pack file with its index. Reading is by position only, so that
// any number of goroutines may use one pack.
type pack struct {
	name  string // path without extension
	index *packIndex

	mu   sync.Mutex
	file *os.File // opened when first needed
}

// open gives the pack file and remembers it.
func (p *pack) open() (*os.File, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.file != nil {
		return p.file, nil
	}
	f, err := os.Open(p.name + ".pack")
	if err != nil {
		return nil, err
	}
	var head [8]byte
	if _, err := f.ReadAt(head[:], 0); err != nil || string(head[:4]) != "PACK" {
		f.Close()
		return nil, fmt.Errorf("pack %q does not begin with PACK", p.name)
	}
	if v := binary.BigEndian.Uint32(head[4:]); v != 2 && v != 3 {
		f.Close()
		return nil, fmt.Errorf("pack %q is of version %d, 2 and 3 are supported", p.name, v)
	}
	p.file = f
	return f, nil
}

func (p *pack) close() error {
	p.index.close()
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.file == nil {
		return nil
	}
	err := p.file.Close()
	p.file = nil
	return err
}

// packEntry is the head of one object in a pack.
type packEntry struct {
	kind   plumbing.ObjectType // may be one of the two kinds of difference
	size   int64               // of what is stored here: the object, or the difference
	data   int64               // where the compressed bytes begin
	offset int64               // of the base, for an OFSDeltaObject
	base   plumbing.Hash       // of the base, for a REFDeltaObject
}

var errPack = errors.New("malformed pack entry")

// entry reads the head of the object at an offset.
func (p *pack) entry(f io.ReaderAt, offset int64) (packEntry, error) {
	var buf [maxPackHead]byte
	n, err := f.ReadAt(buf[:], offset)
	if err != nil && err != io.EOF {
		return packEntry{}, err
	}
	return parsePackEntry(buf[:n], offset)
}

func parsePackEntry(b []byte, at int64) (packEntry, error) {
	if len(b) == 0 {
		return packEntry{}, errPack
	}
	e := packEntry{kind: plumbing.ObjectType(b[0] >> 4 & 7)}
	size, i := uint64(b[0]&15), 1
	for shift := 4; b[i-1]&0x80 != 0; shift += 7 {
		if i == len(b) || shift > 53 {
			return packEntry{}, errPack
		}
		size |= uint64(b[i]&0x7f) << shift
		i++
	}
	e.size = int64(size)
	switch e.kind {
	case plumbing.CommitObject, plumbing.TreeObject, plumbing.BlobObject, plumbing.TagObject:
	case plumbing.OFSDeltaObject:
		// Each further byte adds one, so that no distance has two spellings.
		var back int64
		for first := true; ; first = false {
			if i == len(b) || back > at {
				return packEntry{}, errPack
			}
			c := b[i]
			i++
			if !first {
				back++
			}
			back = back<<7 | int64(c&0x7f)
			if c&0x80 == 0 {
				break
			}
		}
		if back <= 0 || back >= at {
			return packEntry{}, errPack
		}
		e.offset = at - back
	case plumbing.REFDeltaObject:
		if len(b)-i < hashSize {
			return packEntry{}, errPack
		}
		copy(e.base[:], b[i:])
		i += hashSize
	default:
		return packEntry{}, errPack
	}
	e.data = at + int64(i)
	return e, nil
}

// maxPackHead is the longest head: 10 bytes of type and size, then 10 of offset or
// 20 of hash.
const maxPackHead = 30

// delta says whether an entry holds a difference.
func (e packEntry) delta() bool {
	return e.kind == plumbing.OFSDeltaObject || e.kind == plumbing.REFDeltaObject
}

// baseOffset gives where the base of a difference begins in the same pack.
func (p *pack) baseOffset(e packEntry) (int64, error) {
	if e.kind == plumbing.OFSDeltaObject {
		return e.offset, nil
	}
	offset, ok, err := p.index.offset(e.base)
	if err == nil && !ok {
		err = fmt.Errorf("base %s is not in the same pack", e.base)
	}
	return offset, err
}

// describe gives the type and the size of the object at an offset without
// inflating it: of a difference only the first bytes are read.
func (p *pack) describe(f io.ReaderAt, offset int64) (plumbing.ObjectType, int64, error) {
	e, err := p.entry(f, offset)
	if err != nil {
		return 0, 0, err
	}
	size := e.size
	if e.delta() {
		if size, err = deltaTarget(f, e); err != nil {
			return 0, 0, err
		}
	}
	for n := 0; e.delta(); n++ {
		if n == maxChain {
			return 0, 0, fmt.Errorf("more than %d differences in a row", maxChain)
		}
		base, err := p.baseOffset(e)
		if err != nil {
			return 0, 0, err
		}
		if e, err = p.entry(f, base); err != nil {
			return 0, 0, err
		}
	}
	return e.kind, size, nil
}

// deltaTarget reads the size that a difference makes: two numbers begin it, the
// size of the base and that of the result, seven bits a byte, lowest first.
func deltaTarget(f io.ReaderAt, e packEntry) (int64, error) {
	z, err := inflate(f, e.data)
	if err != nil {
		return 0, err
	}
	defer z.release()
	var head [20]byte
	n, err := io.ReadFull(z, head[:min(int64(len(head)), e.size)])
	if err != nil {
		return 0, err
	}
	_, k := binary.Uvarint(head[:n])
	if k <= 0 {
		return 0, errPack
	}
	size, k := binary.Uvarint(head[k:n])
	if k <= 0 || size > 1<<62 {
		return 0, errPack
	}
	return int64(size), nil
}

// errLong says that an object is longer than was asked for.
var errLong = errors.New("object is too long")

// read gives the whole object at an offset, putting differences together. It
// does not check the hash.
func (p *pack) read(f io.ReaderAt, offset int64, cache *baseCache) (plumbing.ObjectType, []byte, error) {
	return p.readAtMost(f, offset, math.MaxInt64, cache, nil)
}

// readAtMost is read for an object of at most limit bytes; of a longer one it
// gives errLong.
func (p *pack) readAtMost(f io.ReaderAt, offset, limit int64, cache *baseCache, blocks *blockCache) (plumbing.ObjectType, []byte, error) {
	type step struct {
		offset int64
		delta  []byte
	}
	var (
		steps []step
		kind  plumbing.ObjectType
		data  []byte
	)
	held := int64(0)
	for {
		if base, ok := cache.get(baseKey{p, offset}); ok {
			kind, data = base.kind, base.data
			if len(steps) == 0 && int64(len(data)) > limit {
				return 0, nil, errLong
			}
			break
		}
		piece, err := p.piece(f, offset, blocks)
		if err != nil {
			return 0, nil, err
		}
		e, err := parsePackEntry(piece[:min(len(piece), maxPackHead)], offset)
		if err != nil {
			return 0, nil, err
		}
		if !e.delta() && len(steps) == 0 && e.size > limit {
			return 0, nil, errLong
		}
		// The differences wait in memory for their base, so they count together.
		if held += e.size; held > maxRebuilt {
			return 0, nil, fmt.Errorf("object of more than %d bytes is not put together", maxRebuilt)
		}
		stored, err := inflatePiece(piece[e.data-offset:], f, e.data, e.size)
		if err != nil {
			return 0, nil, err
		}
		if e.delta() && len(steps) == 0 && deltaSize(stored) > limit {
			return 0, nil, errLong
		}
		if !e.delta() {
			kind, data = e.kind, stored
			if len(steps) > 0 {
				cache.put(baseKey{p, offset}, baseItem{kind, data})
			}
			break
		}
		if len(steps) == maxChain {
			return 0, nil, fmt.Errorf("more than %d differences in a row", maxChain)
		}
		steps = append(steps, step{offset, stored})
		if offset, err = p.baseOffset(e); err != nil {
			return 0, nil, err
		}
	}
	for i := len(steps) - 1; i >= 0; i-- {
		if target := deltaSize(steps[i].delta); target < 0 || target > maxRebuilt {
			return 0, nil, fmt.Errorf("object of more than %d bytes is not put together", maxRebuilt)
		}
		var err error
		if data, err = applyDelta(data, steps[i].delta); err != nil {
			return 0, nil, err
		}
		cache.put(baseKey{p, steps[i].offset}, baseItem{kind, data})
	}
	return kind, data, nil
}

// deltaSize is the size that a difference says it makes, -1 where it says none.
func deltaSize(delta []byte) int64 {
	_, k := binary.Uvarint(delta)
	if k <= 0 {
		return -1
	}
	size, k := binary.Uvarint(delta[k:])
	if k <= 0 || size > maxRebuilt {
		return -1
	}
	return int64(size)
}
