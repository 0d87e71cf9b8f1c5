package revision

import (
	"container/heap"
	"context"

	"github.com/go-git/go-git/v5/plumbing"
)

// walk separates what target reaches from what base reaches.
type walk struct {
	repo     *Repo
	base     plumbing.Hash
	fromBase map[plumbing.Hash]bool // every commit seen; true once base is known to reach it
	queue    byDate
	open     int  // entries of the queue that were reached from target alone
	baseCut  bool // a shallow clone ends before base, where it matters
}

// run goes back from both ends, the newest commit first. A commit that only
// target seems to reach could still turn out to be an ancestor of base when dates
// are out of order. So the walk goes on until that is impossible, because base
// is an ancestor of all those commits, or until everything that base reaches has
// been seen.
func (w *walk) run(ctx context.Context, target plumbing.Hash) error {
	if err := w.visit(target, false); err != nil {
		return err
	}
	if err := w.visit(w.base, true); err != nil {
		return err
	}
	asked := false
	for len(w.queue) > 0 {
		if err := ctx.Err(); err != nil {
			return err
		}
		if w.open == 0 && !asked {
			asked = true
			settled, err := w.settled()
			if err != nil {
				return err
			}
			if settled {
				w.baseCut = false // what lies before base does not matter
				return nil
			}
		}
		at := heap.Pop(&w.queue).(dated)
		if !at.fromBase {
			w.open--
			if w.fromBase[at.hash] {
				continue // queued again since, on base's side
			}
		}
		l, err := w.repo.links(at.hash)
		if err != nil {
			return err
		}
		w.baseCut = w.baseCut || at.fromBase && l.boundary
		for _, p := range l.parents {
			if err := w.visit(p, at.fromBase); err != nil {
				return err
			}
		}
	}
	if w.baseCut {
		// Base itself may be the end of the clone, dated after its children.
		settled, err := w.settled()
		if err != nil {
			return err
		}
		w.baseCut = !settled
	}
	return nil
}

// visit queues a commit that is new, or that is now known to be reached by base.
func (w *walk) visit(h plumbing.Hash, fromBase bool) error {
	before, seen := w.fromBase[h]
	if seen && (before || !fromBase) {
		return nil
	}
	l, err := w.repo.links(h)
	if err != nil {
		return err
	}
	w.fromBase[h] = fromBase
	if !fromBase {
		w.open++
	}
	heap.Push(&w.queue, dated{h, l.when, fromBase})
	return nil
}

// children gives, for every commit that a commit of target's side has as a
// parent, those commits.
func (w *walk) children() (map[plumbing.Hash][]plumbing.Hash, error) {
	out := map[plumbing.Hash][]plumbing.Hash{}
	for h, fromBase := range w.fromBase {
		if fromBase {
			continue
		}
		l, err := w.repo.links(h)
		if err != nil {
			return nil, err
		}
		for _, p := range l.parents {
			out[p] = append(out[p], h)
		}
	}
	return out, nil
}

// settled says whether base is an ancestor of every commit on target's side.
// Then none of them can be an ancestor of base.
func (w *walk) settled() (bool, error) {
	children, err := w.children()
	if err != nil {
		return false, err
	}
	after := map[plumbing.Hash]bool{}
	next := []plumbing.Hash{w.base}
	for len(next) > 0 {
		h := next[len(next)-1]
		next = next[:len(next)-1]
		for _, c := range children[h] {
			if !after[c] {
				after[c] = true
				next = append(next, c)
			}
		}
	}
	for h, fromBase := range w.fromBase {
		if !fromBase && !after[h] {
			return false, nil
		}
	}
	return true, nil
}

// result gives the commits of target's side, children before parents, and
// whether no end of a shallow clone came in the way.
func (w *walk) result() (order []plumbing.Hash, complete bool, err error) {
	children, err := w.children()
	if err != nil {
		return nil, false, err
	}
	complete = !w.baseCut
	waiting := map[plumbing.Hash]int{} // children not yet given
	var ready byDate
	for h, fromBase := range w.fromBase {
		if fromBase {
			continue
		}
		l, err := w.repo.links(h)
		if err != nil {
			return nil, false, err
		}
		complete = complete && !l.boundary
		waiting[h] = len(children[h])
		if waiting[h] == 0 {
			ready = append(ready, dated{hash: h, when: l.when})
		}
	}
	heap.Init(&ready)
	for len(ready) > 0 {
		h := heap.Pop(&ready).(dated).hash
		order = append(order, h)
		l, err := w.repo.links(h)
		if err != nil {
			return nil, false, err
		}
		for _, p := range l.parents {
			n, ours := waiting[p]
			if !ours {
				continue
			}
			if waiting[p] = n - 1; n > 1 {
				continue
			}
			pl, err := w.repo.links(p)
			if err != nil {
				return nil, false, err
			}
			heap.Push(&ready, dated{hash: p, when: pl.when})
		}
	}
	return order, complete, nil
}
