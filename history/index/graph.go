package index

import (
	"context"
	"crypto/sha256"
	"database/sql"
	"encoding/binary"
	"errors"
	"fmt"
	"hash/crc32"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"sync"

	"speedtrail/history/revision"
	"speedtrail/history/trace"
)

// graph is the commits of a folder, numbered from 0, parents before children.
type graph struct {
	folder  int64
	commits []trace.Commit
	bases   []int32              // the nearest commit at or before it, along first parents, that loads; -1: none
	numbers map[trace.Hash]int32 // nil until many were asked for
	asked   int
}

// manyAsked is how many commits are looked for one by one: who asks for more gets
// a map.
const manyAsked = 64

// chunkSize is how many commits one row holds at most.
const chunkSize = 1024

// mostReserved bounds the commits for which room is made before they are read: the
// file is not trusted so far.
const mostReserved = 1 << 20

// The flags of a commit in a chunk.
const (
	isGap = 1 << iota
	isCut
)

// appendCommit writes a commit: its hash, flags, the time since the commit
// before it, and how far back its parents stand.
func appendCommit(data []byte, c *trace.Commit, number int32, previous int64) []byte {
	data = append(data, c.Hash[:]...)
	flags := byte(0)
	if c.Gap != "" {
		flags |= isGap
	}
	if c.Cut {
		flags |= isCut
	}
	data = append(data, flags)
	data = binary.AppendVarint(data, c.When-previous)
	data = binary.AppendUvarint(data, uint64(len(c.Parents)))
	for _, p := range c.Parents {
		data = binary.AppendUvarint(data, uint64(number-p))
	}
	return data
}

var errDamaged = errors.New("a row of the index is damaged")

// castagnoli is made when it is needed: every command would wait for it.
var castagnoli = sync.OnceValue(func() *crc32.Table { return crc32.MakeTable(crc32.Castagnoli) })

// sealed ends a blob with its checksum: a bad disk must not change an answer.
func sealed(data []byte) []byte {
	return binary.LittleEndian.AppendUint32(data, crc32.Checksum(data, castagnoli()))
}

// opened undoes sealed.
func opened(data []byte) ([]byte, error) {
	n := len(data) - crc32.Size
	if n < 0 || binary.LittleEndian.Uint32(data[n:]) != crc32.Checksum(data[:n], castagnoli()) {
		return nil, errDamaged
	}
	return data[:n], nil
}

// readChunk appends the commits of a chunk. Of a gap it cannot know the text: it
// writes a mark that is filled in later.
func (g *graph) readChunk(data []byte, count int64) error {
	data, err := opened(data)
	if err != nil {
		return err
	}
	previous := int64(0)
	parents := make([]int32, 0, count+8)
	g.commits = slices.Grow(g.commits, int(count))
	g.bases = slices.Grow(g.bases, int(count))
	for range count {
		var c trace.Commit
		if len(data) <= len(c.Hash) {
			return errDamaged
		}
		copy(c.Hash[:], data)
		flags := data[len(c.Hash)]
		data = data[len(c.Hash)+1:]
		c.Cut = flags&isCut != 0
		if flags&isGap != 0 {
			c.Gap = "not known"
		}
		when, n := binary.Varint(data)
		if n <= 0 {
			return errDamaged
		}
		data = data[n:]
		previous += when
		c.When = previous
		length, n := binary.Uvarint(data)
		if n <= 0 || length > uint64(len(data)) {
			return errDamaged
		}
		data = data[n:]
		number := int32(len(g.commits))
		first := len(parents)
		for range length {
			back, n := binary.Uvarint(data)
			if n <= 0 || back == 0 || back > uint64(number) {
				return errDamaged
			}
			parents = append(parents, number-int32(back))
			data = data[n:]
		}
		c.Parents = parents[first:len(parents):len(parents)]
		g.add(c)
	}
	if len(data) > 0 {
		return errDamaged
	}
	return nil
}

func (g *graph) add(c trace.Commit) {
	number := int32(len(g.commits))
	base := number
	if c.Gap != "" {
		base = -1
		if len(c.Parents) > 0 {
			base = g.bases[c.Parents[0]]
		}
	}
	g.commits = append(g.commits, c)
	g.bases = append(g.bases, base)
	if g.numbers != nil {
		g.numbers[c.Hash] = number
	}
}

// graph reads the commits of a data set folder. It is called in a transaction.
func (x *Index) graph(ctx context.Context, path string) (*graph, error) {
	if err := x.renew(ctx); err != nil {
		return nil, err
	}
	if g := x.graphs[path]; g != nil {
		return g, x.extend(ctx, g)
	}
	g := &graph{}
	err := x.conn.QueryRowContext(ctx, "SELECT id FROM folder WHERE path = ?", path).Scan(&g.folder)
	if errors.Is(err, sql.ErrNoRows) {
		return g, nil
	}
	if err != nil {
		return nil, err
	}
	if err := x.extend(ctx, g); err != nil {
		return nil, err
	}
	if x.graphs == nil {
		x.graphs = map[string]*graph{}
	}
	x.graphs[path] = g
	return g, nil
}

// extend reads the commits that were added since.
func (x *Index) extend(ctx context.Context, g *graph) error {
	// The last chunk may have grown: it is read again. All before it are full.
	have := int64(len(g.commits))
	var all int64
	if err := x.conn.QueryRowContext(ctx, "SELECT coalesce(max(first), 0) + ? FROM chunk WHERE folder = ?", chunkSize, g.folder).Scan(&all); err != nil {
		return err
	}
	if more := all - have; more > 0 && all <= mostReserved {
		g.commits, g.bases = slices.Grow(g.commits, int(more)), slices.Grow(g.bases, int(more))
	}
	rows, err := x.conn.QueryContext(ctx, "SELECT first, commits, data FROM chunk WHERE folder = ? AND first > ? ORDER BY first", g.folder, have-chunkSize)
	if err != nil {
		return err
	}
	defer rows.Close()
	for rows.Next() {
		var first, count int64
		var data sql.RawBytes
		if err := rows.Scan(&first, &count, &data); err != nil {
			return err
		}
		if first > int64(len(g.commits)) || count < 1 || count > chunkSize {
			return errDamaged
		}
		if first+count <= have {
			continue
		}
		for _, c := range g.commits[first:] {
			delete(g.numbers, c.Hash)
		}
		g.commits, g.bases = g.commits[:first], g.bases[:first]
		if err := g.readChunk(data, count); err != nil {
			return err
		}
	}
	return rows.Err()
}

// number finds a commit. What is asked for is mostly new.
func (g *graph) number(h trace.Hash) (int32, bool) {
	if g.asked++; g.numbers == nil && g.asked > manyAsked {
		g.byHash()
	}
	if g.numbers != nil {
		n, ok := g.numbers[h]
		return n, ok
	}
	for i := len(g.commits) - 1; i >= 0; i-- {
		if g.commits[i].Hash == h {
			return int32(i), true
		}
	}
	return 0, false
}

// byHash prepares for finding many commits.
func (g *graph) byHash() {
	g.numbers = make(map[trace.Hash]int32, len(g.commits))
	for i := range g.commits {
		g.numbers[g.commits[i].Hash] = int32(i)
	}
}

// Name is the name under which the history of a data set folder is kept. Where a
// shallow clone ends is part of it: when that moves, commits have other parents.
func Name(repo *revision.Repo, folder string) (string, error) {
	list, err := os.ReadFile(filepath.Join(repo.CommonDir(), "shallow"))
	switch {
	case errors.Is(err, fs.ErrNotExist) || err == nil && len(list) == 0:
		return folder, nil
	case err != nil:
		return "", fmt.Errorf("%w: %w", ErrFailed, err)
	}
	return fmt.Sprintf("%s shallow %x", folder, sha256.Sum256(list)), nil
}
