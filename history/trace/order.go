package trace

import (
	"bytes"
	"container/heap"
)

// line is what a trace goes along: the commits before the newest one, and for
// each the nearest ones before it whose data set loads.
type line struct {
	h           *History
	firstParent bool
	order       []int32   // children before their parents, otherwise the newest first
	before      [][]int32 // of each commit that loads
	across      []int32   // how many commits that do not load lie between
	reached     []bool
	listed      []int32 // of each commit: one more than the last one that has it in before
}

// parents gives the parents that count.
func (l *line) parents(c int32) []int32 {
	p := l.h.Commits[c].Parents
	if l.firstParent && len(p) > 1 {
		p = p[:1]
	}
	return p
}

func newLine(h *History, firstParent bool) *line {
	l := &line{h: h, firstParent: firstParent, reached: make([]bool, len(h.Commits)), listed: make([]int32, len(h.Commits))}
	// Parents stand before their children: one pass from the newest finds all
	// that is reached, one from the oldest looks through the gaps.
	children := make([]int32, len(h.Commits))
	l.reached[h.Tip] = true
	for c := h.Tip; c >= 0; c-- {
		if !l.reached[c] {
			continue
		}
		for _, p := range l.parents(c) {
			l.reached[p] = true
			children[p]++
		}
	}
	l.before = make([][]int32, len(h.Commits))
	l.across = make([]int32, len(h.Commits))
	for c := range h.Tip + 1 {
		if l.reached[c] {
			l.lookThrough(c)
		}
	}
	ready := &newest{h: h, list: []int32{h.Tip}}
	for ready.Len() > 0 {
		c := heap.Pop(ready).(int32)
		l.order = append(l.order, c)
		for _, p := range l.parents(c) {
			if children[p]--; children[p] == 0 {
				heap.Push(ready, p)
			}
		}
	}
	return l
}

// lookThrough finds the nearest commits before c that load, in the order of the
// parents. For a commit that does not load it finds them, too: what comes after
// it looks through it.
func (l *line) lookThrough(c int32) {
	parents := l.parents(c)
	gaps := false
	for _, p := range parents {
		gaps = gaps || l.h.State[p] == Gap
	}
	if !gaps {
		l.before[c] = parents
		return
	}
	var list []int32
	add := func(p int32) {
		if l.listed[p] != c+1 {
			l.listed[p] = c + 1
			list = append(list, p)
		}
	}
	for _, p := range parents {
		if l.h.State[p] != Gap {
			add(p)
			continue
		}
		l.across[c] = max(l.across[c], l.across[p]+1)
		for _, q := range l.before[p] {
			add(q)
		}
	}
	l.before[c] = list
}

// newest is a heap of commits by the committer's date, the newest first, equal
// dates by hash: the order of revision.Between.
type newest struct {
	h    *History
	list []int32
}

func (q *newest) Len() int      { return len(q.list) }
func (q *newest) Swap(i, j int) { q.list[i], q.list[j] = q.list[j], q.list[i] }
func (q *newest) Push(x any)    { q.list = append(q.list, x.(int32)) }
func (q *newest) Less(i, j int) bool {
	a, b := &q.h.Commits[q.list[i]], &q.h.Commits[q.list[j]]
	if a.When != b.When {
		return a.When > b.When
	}
	return bytes.Compare(a.Hash[:], b.Hash[:]) < 0
}
func (q *newest) Pop() any {
	last := len(q.list) - 1
	x := q.list[last]
	q.list = q.list[:last]
	return x
}
