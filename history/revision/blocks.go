package revision

import (
	"io"
	"sync"
)

// Blocks of a pack are kept: the objects of a history stand close together, and
// to ask the system for each by itself costs more than to decompress it.
const (
	blockSize  = 64 << 10
	blockExtra = 4 << 10 // what a block has beyond its size, so that a small object never ends past it
	maxBlocks  = 64      // of a pack: 4 MiB

	// The first objects are read without blocks: who asks for a few does not
	// need their neighbours.
	fewReads = 200
)

// blocks reads a file by position, block by block. It is safe for concurrent use.
type blocks struct {
	file io.ReaderAt
	mu   sync.Mutex
	kept map[int64][]byte // never changed once they are here
	few  int              // reads without blocks
}

// at gives what follows an offset, some blockExtra bytes at least unless the file
// ends before.
func (b *blocks) at(offset int64) ([]byte, error) {
	n := offset / blockSize
	b.mu.Lock()
	if b.few < fewReads {
		b.few++
		b.mu.Unlock()
		return readUpTo(b.file, offset, blockExtra)
	}
	data, ok := b.kept[n]
	b.mu.Unlock()
	if !ok {
		var err error
		if data, err = readUpTo(b.file, n*blockSize, blockSize+blockExtra); err != nil {
			return nil, err
		}
		b.mu.Lock()
		if len(b.kept) >= maxBlocks || b.kept == nil {
			b.kept = map[int64][]byte{}
		}
		b.kept[n] = data
		b.mu.Unlock()
	}
	if offset -= n * blockSize; offset >= int64(len(data)) {
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
