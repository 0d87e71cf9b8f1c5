package revision

import (
	"sync"

	"github.com/go-git/go-git/v5/plumbing"
)

// maxBaseCache bounds the bases that are kept to put other objects together, in
// bytes.
const maxBaseCache = 8 << 20

// baseCache keeps the objects of packs that differences were applied to: those of
// two spans of time, of which the later one takes what is asked for over from the
// earlier one, and follows it when it is full. (A list in the order of use would
// cost as much as the difference does.) It is safe for concurrent use.
type baseCache struct {
	mu           sync.Mutex
	now, earlier map[baseKey]baseItem
	bytes        int // of now
}

type baseKey struct {
	pack   *pack
	offset int64
}

type baseItem struct {
	kind plumbing.ObjectType
	data []byte // never changed once it is here
}

func (c *baseCache) get(p *pack, offset int64) (plumbing.ObjectType, []byte, bool) {
	key := baseKey{p, offset}
	c.mu.Lock()
	defer c.mu.Unlock()
	item, ok := c.now[key]
	if !ok {
		if item, ok = c.earlier[key]; ok {
			c.add(key, item)
		}
	}
	return item.kind, item.data, ok
}

func (c *baseCache) put(p *pack, offset int64, kind plumbing.ObjectType, data []byte) {
	if len(data) > maxBaseCache/4 {
		return
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	c.add(baseKey{p, offset}, baseItem{kind, data})
}

func (c *baseCache) add(key baseKey, item baseItem) {
	if _, ok := c.now[key]; ok {
		return
	}
	if c.now == nil || c.bytes+len(item.data) > maxBaseCache/2 {
		c.earlier, c.now, c.bytes = c.now, make(map[baseKey]baseItem, len(c.now)), 0
	}
	c.now[key] = item
	c.bytes += len(item.data)
}
