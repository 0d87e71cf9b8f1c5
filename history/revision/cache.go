package revision

import (
	"sync"

	"github.com/go-git/go-git/v5/plumbing"
)

// recent keeps what was asked for lately, in memory up to a bound: the things of
// two spans of time, of which the later one takes what is asked for over from the
// earlier one, and follows it when it is full. (A list in the order of use would
// cost as much as to put an object together.) It is safe for concurrent use, and
// what it holds is never changed.
type recent[K comparable, V any] struct {
	most int         // bytes
	size func(V) int // of a thing, in bytes

	mu           sync.Mutex
	now, earlier map[K]V
	bytes        int // of now
}

func (c *recent[K, V]) get(key K) (V, bool) {
	c.mu.Lock()
	defer c.mu.Unlock()
	v, ok := c.now[key]
	if !ok {
		if v, ok = c.earlier[key]; ok {
			c.add(key, v)
		}
	}
	return v, ok
}

// put adds a thing, unless it is so large that little else would have room.
func (c *recent[K, V]) put(key K, v V) {
	if c.size(v) > c.most/4 {
		return
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	c.add(key, v)
}

func (c *recent[K, V]) add(key K, v V) {
	if _, ok := c.now[key]; ok {
		return
	}
	if c.now == nil || c.bytes+c.size(v) > c.most/2 {
		c.earlier, c.now, c.bytes = c.now, make(map[K]V, len(c.now)), 0
	}
	c.now[key] = v
	c.bytes += c.size(v)
}

// maxBaseCache bounds the bases that are kept to put other objects together, in
// bytes.
const maxBaseCache = 8 << 20

// baseCache keeps the objects of packs that differences were applied to.
type baseCache = recent[baseKey, baseItem]

type baseKey struct {
	pack   *pack
	offset int64
}

type baseItem struct {
	kind plumbing.ObjectType
	data []byte
}

func newBaseCache() *baseCache {
	return &baseCache{most: maxBaseCache, size: func(b baseItem) int { return len(b.data) }}
}
