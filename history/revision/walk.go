package revision

import (
	"bytes"
	"container/heap"
	"context"
	"fmt"

	"github.com/go-git/go-git/v5/plumbing"
)

// maxLinks bounds how many commits' parents are kept, in number.
const maxLinks = 2_000_000

// links gives the parents of a commit as far as this clone goes.
func (r *Repo) links(h plumbing.Hash) (links, error) {
	r.linksMu.Lock()
	l, ok := r.linksSeen[h]
	r.linksMu.Unlock()
	if ok {
		return l, nil
	}
	data, err := r.read(h, plumbing.CommitObject, maxCommit, "the history")
	if err != nil {
		return links{}, err
	}
	if l, err = parseLinks(data); err != nil {
		return links{}, corrupt(fmt.Sprintf("commit %s is malformed", h), err)
	}
	if r.shallow[h] {
		// What lies behind is cut off even where an object happens to be here.
		l.boundary = len(l.parents) > 0
		l.parents = nil
	}
	r.linksMu.Lock()
	defer r.linksMu.Unlock()
	if len(r.linksSeen) >= maxLinks {
		clear(r.linksSeen)
	}
	r.linksSeen[h] = l
	return l, nil
}

// byDate is a heap of commits, the newest first; equal instants in order of
// their hashes, so that the order never depends on chance.
type byDate []dated

type dated struct {
	hash     plumbing.Hash
	when     int64
	fromBase bool // used by Between alone
}

func (q byDate) Len() int      { return len(q) }
func (q byDate) Swap(i, j int) { q[i], q[j] = q[j], q[i] }
func (q *byDate) Push(x any)   { *q = append(*q, x.(dated)) }
func (q byDate) Less(i, j int) bool {
	if q[i].when != q[j].when {
		return q[i].when > q[j].when
	}
	return bytes.Compare(q[i].hash[:], q[j].hash[:]) < 0
}
func (q *byDate) Pop() any {
	last := len(*q) - 1
	x := (*q)[last]
	*q = (*q)[:last]
	return x
}

// hashes reads the full hashes of two commits.
func hashes(base, target string) (b, t plumbing.Hash, err error) {
	for _, x := range []struct {
		text string
		to   *plumbing.Hash
	}{{base, &b}, {target, &t}} {
		h, ok := parseHash(x.text)
		if !ok {
			return b, t, unknown(x.text, "a full commit hash is needed here")
		}
		*x.to = h
	}
	return b, t, nil
}

// IsAncestor says whether base is target or can be reached from it by going
// from commit to parent. Both are full commit hashes. Where a shallow clone ends
// before base was found the answer is not known, and the error is of class
// ErrShallow.
func (r *Repo) IsAncestor(ctx context.Context, base, target string) (bool, error) {
	b, t, err := hashes(base, target)
	if err != nil {
		return false, err
	}
	if _, err := r.links(b); err != nil {
		return false, err
	}
	seen := map[plumbing.Hash]bool{t: true}
	l, err := r.links(t)
	if err != nil {
		return false, err
	}
	queue := byDate{{hash: t, when: l.when}}
	var cut *plumbing.Hash
	for len(queue) > 0 {
		if err := ctx.Err(); err != nil {
			return false, err
		}
		at := heap.Pop(&queue).(dated)
		if at.hash == b {
			return true, nil
		}
		l, err := r.links(at.hash)
		if err != nil {
			return false, err
		}
		if l.boundary && cut == nil {
			cut = &at.hash
		}
		for _, p := range l.parents {
			if seen[p] {
				continue
			}
			seen[p] = true
			pl, err := r.links(p)
			if err != nil {
				return false, err
			}
			heap.Push(&queue, dated{hash: p, when: pl.when})
		}
	}
	if cut != nil {
		return false, r.shallowError(fmt.Sprintf("whether commit %s came before %s", base, target), *cut)
	}
	return false, nil
}

// Between gives the commits that can be reached from target and not from base,
// as `git rev-list base..target` does: children before their parents, otherwise
// the newest first by the committer's date, then by hash. Both are full commit
// hashes. complete is false where a shallow clone ends on the way, so that
// commits may be missing or belong to base.
func (r *Repo) Between(ctx context.Context, base, target string) (commits []Commit, complete bool, err error) {
	b, t, err := hashes(base, target)
	if err != nil {
		return nil, false, err
	}
	w := walk{repo: r, base: b, fromBase: map[plumbing.Hash]bool{}}
	if err := w.run(ctx, t); err != nil {
		return nil, false, err
	}
	order, complete, err := w.result()
	if err != nil {
		return nil, false, err
	}
	commits = make([]Commit, 0, len(order))
	for _, h := range order {
		if err := ctx.Err(); err != nil {
			return nil, false, err
		}
		c, err := r.commit(h)
		if err != nil {
			return nil, false, err
		}
		commits = append(commits, c)
	}
	return commits, complete, nil
}
