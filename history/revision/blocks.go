package revision

import (
	"io"
	"sync/atomic"
)

// Blocks of packs are kept: the objects of a history stand close together, and to
// ask the system for each by itself costs more than to decompress it.
const (
	blockSize  = 64 << 10
	blockExtra = 4 << 10  // what a block has beyond its size, so that a small object never ends past it
	maxBlocks  = 16 << 20 // bytes, of all packs

	// The first objects are read without blocks: who asks for a few does not
	// need their neighbours.
	fewReads = 200
)

// blockCache keeps the blocks of packs.
type blockCache struct {
	recent[blockKey, []byte]
	few atomic.Int32 // reads without blocks
}

type blockKey struct {
	pack   *pack
	number int64
}

func newBlockCache() *blockCache {
	return &blockCache{recent: recent[blockKey, []byte]{most: maxBlocks, size: func(b []byte) int { return len(b) }}}
}

// piece gives what follows an offset of the pack's file, some blockExtra bytes at
// least unless the file ends before. Without a cache, just that is read.
func (p *pack) piece(f io.ReaderAt, offset int64, cache *blockCache) ([]byte, error) {
	if cache == nil || cache.few.Load() < fewReads {
		if cache != nil {
			cache.few.Add(1)
		}
		return readUpTo(f, offset, blockExtra)
	}
	key := blockKey{p, offset / blockSize}
	data, ok := cache.get(key)
	if !ok {
		var err error
		if data, err = readUpTo(f, key.number*blockSize, blockSize+blockExtra); err != nil {
			return nil, err
		}
		cache.put(key, data)
	}
	if offset -= key.number * blockSize; offset >= int64(len(data)) {
		return nil, io.EOF
	}
	return data[offset:], nil
}

// readUpTo reads so many bytes from an offset on, or as many as there are.
func readUpTo(f io.ReaderAt, offset int64, size int) ([]byte, error) {
	data := make([]byte, size)
	n, err := f.ReadAt(data, offset)
	if err != nil && err != io.EOF {
		return nil, err
	}
	return data[:n:n], nil
}
