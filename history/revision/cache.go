package revision

import (
	"container/list"
	"sync"

	"github.com/go-git/go-git/v5/plumbing"
)

// maxBaseCache bounds the bases that are kept to put other objects together, in
// bytes.
const maxBaseCache = 8 << 20

// baseCache keeps the objects of packs that differences were applied to, the
// least recently used leaving first. It is safe for concurrent use.
type baseCache struct {
	mu    sync.Mutex
	items map[baseKey]*list.Element
	order list.List // of *baseItem, most recently used first
	bytes int
}

type baseKey struct {
	pack   *pack
	offset int64
}

type baseItem struct {
	key  baseKey
	kind plumbing.ObjectType
	data []byte // never changed once it is here
}

func (c *baseCache) get(p *pack, offset int64) (plumbing.ObjectType, []byte, bool) {
	c.mu.Lock()
	defer c.mu.Unlock()
	e, ok := c.items[baseKey{p, offset}]
	if !ok {
		return 0, nil, false
	}
	c.order.MoveToFront(e)
	item := e.Value.(*baseItem)
	return item.kind, item.data, true
}

func (c *baseCache) put(p *pack, offset int64, kind plumbing.ObjectType, data []byte) {
	if len(data) > maxBaseCache/4 {
		return
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	key := baseKey{p, offset}
	if _, ok := c.items[key]; ok {
		return
	}
	if c.items == nil {
		c.items = map[baseKey]*list.Element{}
	}
	c.items[key] = c.order.PushFront(&baseItem{key, kind, data})
	c.bytes += len(data)
	for c.bytes > maxBaseCache {
		last := c.order.Back()
		item := c.order.Remove(last).(*baseItem)
		delete(c.items, item.key)
		c.bytes -= len(item.data)
	}
}
