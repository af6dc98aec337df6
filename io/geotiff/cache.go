package geotiff

import (
	"container/list"
	"sync"
)

// cache keeps the blocks decoded last, up to a number of bytes in all. Blocks asked for twice at once are decoded once.
type cache struct {
	most int

	mu     sync.Mutex
	size   int
	recent *list.List // of *block, latest first
	at     map[blockKey]*list.Element
}

type blockKey struct{ plane, j, i int }

// block is a decoded block: once has made cells, or err, by the time get returns it.
type block struct {
	key   blockKey
	size  int
	once  sync.Once
	cells []byte // nil where the file has no such block
	err   error
}

func newCache(most int) *cache {
	return &cache{most: most, recent: list.New(), at: map[blockKey]*list.Element{}}
}

// get returns a block, decoding it if it is not at hand. size is what it takes when decoded.
func (c *cache) get(key blockKey, size int, decode func() ([]byte, error)) ([]byte, error) {
	b := c.claim(key, size)
	b.once.Do(func() { b.cells, b.err = decode() })
	return b.cells, b.err
}

// claim finds a block or makes room for it; whoever still uses a block that goes keeps it alive.
func (c *cache) claim(key blockKey, size int) *block {
	c.mu.Lock()
	defer c.mu.Unlock()
	if e, ok := c.at[key]; ok {
		c.recent.MoveToFront(e)
		return e.Value.(*block)
	}
	b := &block{key: key, size: size}
	c.at[key] = c.recent.PushFront(b)
	c.size += size
	for c.size > c.most && c.recent.Len() > 1 {
		last := c.recent.Remove(c.recent.Back()).(*block)
		delete(c.at, last.key)
		c.size -= last.size
	}
	return b
}
