package revision

import (
	"bytes"
	"fmt"

	"speedtrail/schema/common"
)

// TreeChange is a line that two trees do not have in common. A side that has no
// line of this name and kind, folder or not, is without a Name.
type TreeChange struct{ Old, Now TreeEntry }

// changes compares two trees, of which the first is trusted. It refuses what
// parseTree refuses.
func (t Tree) changes(before Tree) ([]TreeChange, error) {
	c := treeDiff{old: before.data, now: t.data, ordered: true}
	c.begin()
	for len(c.old) > 0 || len(c.now) > 0 {
		if err := c.next(); err != nil {
			return nil, err
		}
	}
	return c.list, t.once(c.added)
}

// treeDiff goes through two trees side by side. old is trusted; of now what differs
// from it is checked.
type treeDiff struct {
	old, now []byte // what is left of them
	list     []TreeChange
	added    []string // names that old does not have, or has for another kind

	// The line of now before the next one: as it is stored, and once that was looked
	// at its key. ordered: it stands in old, too.
	lastRaw []byte
	last    string
	ordered bool

	// The first line of old, once it was looked at: else its length is 0.
	first    treeEntry
	firstKey string
	firstLen int
}

// begin passes over what both begin with, but for the last of its lines, which the
// next one has to follow.
func (c *treeDiff) begin() {
	for same := common.Start(c.old, c.now); ; {
		n := rawEntry(c.now)
		if n == 0 || n > same {
			return
		}
		c.lastRaw, c.old, c.now, same = c.now[:n], c.old[n:], c.now[n:], same-n
	}
}

// next goes on by a line of one of them, or by all that both have there.
func (c *treeDiff) next() error {
	n := rawEntry(c.now)
	if len(c.now) > 0 && n == 0 {
		return fmt.Errorf("the last entry is cut short")
	}
	if n > 0 && len(c.old) >= n && bytes.Equal(c.old[:n], c.now[:n]) {
		return c.same(n)
	}
	if len(c.old) > 0 && c.firstLen == 0 {
		if err := c.look(); err != nil {
			return err
		}
	}
	if n == 0 {
		c.gone()
		return nil
	}
	e, err := parseEntry(c.now[:n])
	if err != nil {
		return err
	}
	key := sortKey(e)
	if len(c.old) > 0 && c.firstKey < key {
		c.gone()
		return nil
	}
	c.now = c.now[n:]
	return c.come(&e, key)
}

// same passes over a line of n bytes that both have, behind one that they do not have
// in common, and over those that follow it in both.
func (c *treeDiff) same(n int) error {
	e, err := parseEntry(c.now[:n])
	if err != nil {
		return err
	}
	if sortKey(e) <= c.last {
		return fmt.Errorf("entry %q is out of order", e.name)
	}
	c.ordered, c.firstLen = true, 0
	last, old, now := c.now[:n], c.old[n:], c.now[n:]
	if bytes.Equal(old, now) {
		old, now = nil, nil // most changes are single lines
	}
	for {
		n := rawEntry(now)
		if n == 0 || len(old) < n || !bytes.Equal(old[:n], now[:n]) {
			break
		}
		last, old, now = now[:n], old[n:], now[n:]
	}
	c.lastRaw, c.old, c.now = last, old, now
	return nil
}

// look reads the first line of old.
func (c *treeDiff) look() (err error) {
	if c.firstLen = rawEntry(c.old); c.firstLen == 0 {
		return fmt.Errorf("an entry is cut short")
	}
	if c.first, err = parseEntry(c.old[:c.firstLen]); err == nil {
		c.firstKey = sortKey(c.first)
	}
	return err
}

// gone notes that now does not have the first line of old.
func (c *treeDiff) gone() {
	c.list = append(c.list, TreeChange{Old: c.first.public()})
	c.old, c.firstLen = c.old[c.firstLen:], 0
}

// come takes up a line of now that old has otherwise, or not at all.
func (c *treeDiff) come(e *treeEntry, key string) error {
	if c.ordered && c.lastRaw != nil {
		before, err := parseEntry(c.lastRaw)
		if err != nil {
			return err
		}
		c.last = sortKey(before)
	}
	if key <= c.last {
		return fmt.Errorf("entry %q is out of order", e.name)
	}
	c.last, c.ordered, c.lastRaw = key, false, nil
	if len(c.old) > 0 && c.firstKey == key {
		c.list = append(c.list, TreeChange{c.first.public(), e.public()})
		c.old, c.firstLen = c.old[c.firstLen:], 0
	} else {
		c.list = append(c.list, TreeChange{Now: e.public()})
		c.added = append(c.added, e.name)
	}
	return nil
}

// once checks that names do not stand in the tree for a folder and for something
// else, too.
func (t Tree) once(names []string) error {
	if len(names) == 0 {
		return nil
	}
	count := make(map[string]int, len(names))
	for _, n := range names {
		count[n] = 0
	}
	for e := range t.All() {
		if n, ok := count[e.Name]; ok {
			if n > 0 {
				return fmt.Errorf("entry %q occurs twice", e.Name)
			}
			count[e.Name]++
		}
	}
	return nil
}
