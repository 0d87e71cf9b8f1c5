package index

import (
	"context"
	"database/sql"
	"encoding/binary"
	"errors"
	"hash/crc32"
	"sync"

	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/common"
)

// Versions of a route mostly differ in one row. A version is therefore kept as
// what it has otherwise than the version of the same folder that was read before
// it: its own checksum, the number of bytes that both begin and end with, and
// what stands between.

// longestChain is how many versions lie at most between one and the one that is
// kept whole.
const longestChain = 32

// mostFolders bounds the folders whose last version is kept in memory.
const mostFolders = 4096

// packed is a version as a row holds it.
type packed struct {
	base *trace.Key // nil: it is kept whole
	data []byte
}

// packer packs versions. It is safe for concurrent use.
type packer struct {
	mu   sync.Mutex
	last map[string]lastVersion // by folder
}

type lastVersion struct {
	key   trace.Key
	whole []byte // sealed
	chain int
}

// pack gives a version as it is kept. Versions of one folder are packed in the
// order in which they are added.
func (p *packer) pack(key trace.Key, folder string, r *schema.Route) packed {
	whole := encode(r)
	p.mu.Lock()
	defer p.mu.Unlock()
	before, ok := p.last[folder]
	now := lastVersion{key: key, whole: whole}
	out := packed{data: whole}
	if ok && before.chain < longestChain {
		if d := difference(before.whole, whole); len(d) < len(whole)/2 {
			out = packed{base: &before.key, data: d}
			now.chain = before.chain + 1
		}
	}
	if len(p.last) >= mostFolders || p.last == nil {
		p.last = map[string]lastVersion{}
	}
	p.last[folder] = now
	return out
}

// difference writes what a sealed blob has otherwise than another one.
func difference(before, now []byte) []byte {
	a, b := before[:len(before)-crc32.Size], now[:len(now)-crc32.Size]
	start := common.Start(a, b)
	end := common.End(a[start:], b[start:])
	d := make([]byte, 0, 16+len(b)-start-end)
	d = append(d, now[len(b):]...)
	d = binary.AppendUvarint(d, uint64(start))
	d = binary.AppendUvarint(d, uint64(end))
	return append(d, b[start:len(b)-end]...)
}

// apply undoes difference. What it gives is to be checked by opened.
func apply(before, d []byte) ([]byte, error) {
	if len(before) < crc32.Size || len(d) < crc32.Size {
		return nil, errDamaged
	}
	a, sum, d := before[:len(before)-crc32.Size], d[:crc32.Size], d[crc32.Size:]
	start, n := binary.Uvarint(d)
	if n <= 0 {
		return nil, errDamaged
	}
	d = d[n:]
	end, n := binary.Uvarint(d)
	if n <= 0 || start > uint64(len(a)) || end > uint64(len(a))-start {
		return nil, errDamaged
	}
	d = d[n:]
	now := make([]byte, 0, int(start)+len(d)+int(end)+crc32.Size)
	now = append(append(append(now, a[:start]...), d...), a[uint64(len(a))-end:]...)
	return append(now, sum...), nil
}

// row is a version as it is kept.
type row struct {
	id   int64
	base sql.NullInt64
	data []byte
}

// unpacker puts versions together.
type unpacker struct {
	ctx   context.Context
	x     *Index
	rows  map[int64]row // that were read already
	whole map[int64][]byte
}

// unpack gives a sealed version.
func (u *unpacker) unpack(r row) ([]byte, error) {
	chain := []row{r}
	for {
		if whole, ok := u.whole[r.id]; ok {
			chain = chain[:len(chain)-1]
			return u.build(whole, chain)
		}
		if !r.base.Valid {
			return u.build(nil, chain)
		}
		base, ok := u.rows[r.base.Int64]
		if !ok {
			base.id = r.base.Int64
			err := u.x.conn.QueryRowContext(u.ctx, "SELECT base, data FROM version WHERE id = ?", base.id).Scan(&base.base, &base.data)
			if errors.Is(err, sql.ErrNoRows) {
				err = errDamaged
			}
			if err != nil {
				return nil, err
			}
		}
		if base.id >= r.id || len(chain) > longestChain {
			return nil, errDamaged
		}
		chain = append(chain, base)
		r = base
	}
}

// build applies a chain, the newest first, to the version before it.
func (u *unpacker) build(whole []byte, chain []row) ([]byte, error) {
	for i := len(chain) - 1; i >= 0; i-- {
		if !chain[i].base.Valid {
			whole = chain[i].data
		} else {
			var err error
			if whole, err = apply(whole, chain[i].data); err != nil {
				return nil, err
			}
		}
		u.whole[chain[i].id] = whole
	}
	return whole, nil
}
