package revision

import (
	"errors"
	"io/fs"
	"os"
	"sync"

	"github.com/go-git/go-git/v5/plumbing"
)

// readAtMost gives the type and the content of an object of at most limit bytes,
// checked against its hash. It is false where anything is out of the ordinary:
// find and read know what.
func (s *store) readAtMost(h plumbing.Hash, limit int64) (kind plumbing.ObjectType, data []byte, ok bool) {
	kind, data, ok = s.stored(h, limit)
	return kind, data, ok && sumIs(kind, data, h) == nil
}

// stored is readAtMost without a look at the hash.
func (s *store) stored(h plumbing.Hash, limit int64) (kind plumbing.ObjectType, data []byte, ok bool) {
	packs, err := s.current(false)
	if err != nil {
		return 0, nil, false
	}
	for _, p := range packs {
		offset, here, err := p.index.offset(h)
		if err != nil {
			return 0, nil, false
		}
		if !here {
			continue
		}
		f, err := p.open()
		if err != nil {
			return 0, nil, false
		}
		if kind, data, err = p.readAtMost(f, offset, limit, s.bases, s.blocks); err != nil {
			return 0, nil, false
		}
		return kind, data, true
	}
	for _, dir := range s.dirs {
		o := &object{hash: h, store: s, loose: hex2(dir, h)}
		f, err := os.Open(o.loose)
		if errors.Is(err, fs.ErrNotExist) {
			continue
		}
		if err != nil {
			return 0, nil, false
		}
		defer f.Close()
		z, err := o.openLoose(f)
		if err != nil {
			return 0, nil, false
		}
		defer z.release()
		if o.size > limit {
			return 0, nil, false
		}
		if data, err = readExactly(z, o.size); err != nil {
			return 0, nil, false
		}
		return o.kind, data, true
	}
	return 0, nil, false
}

// sums are hashes for use again: most objects are small.
var sums = sync.Pool{New: func() any { return newSumming() }}

// sumIs checks the hash of a whole object.
func sumIs(kind plumbing.ObjectType, data []byte, h plumbing.Hash) error {
	sum := sums.Get().(summing)
	defer sums.Put(sum)
	sum.Reset()
	writeHead(sum, kind, int64(len(data)))
	sum.Write(data)
	return checkSum(sum, h)
}
