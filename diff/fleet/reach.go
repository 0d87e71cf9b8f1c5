package fleet

import (
	"cmp"
	"slices"
	"sort"

	"speedtrail/diff/align"
	"speedtrail/diff/profile"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// reach finds where a train of any class and of some length, above 0 and up to
// the longest, sees a change.
//
// A train whose front is at x and whose rear is at y is bound by the rows
// without train length delay at x, and by every row with it that begins
// before x and ends after y (nominal direction). At a fixed x the speed thus
// falls in steps as the train grows: at the ends of the delayed rows behind x.
// Between two such ends all lengths see the same, so that trying one length in
// each part tries them all.
func (p *pair) reach(longest unit.Distance) []align.Interval {
	straight := !slices.ContainsFunc(p.cells, func(c align.Cell) bool { return c.Base != c.Target })
	var found []align.Interval
	for i := range p.kinds {
		k := &p.kinds[i]
		before, after := p.base.Bounds(k.before), p.target.Bounds(k.after)
		if straight && slices.Equal(before, after) {
			continue
		}
		windowBefore, windowAfter := newWindow(before, longest), newWindow(after, longest)
		for _, cell := range p.cells {
			b, a := windowBefore.near(cell.Base, cell.Base+cell.Length), windowAfter.near(cell.Target, cell.Target+cell.Length)
			k.reach = append(k.reach, p.cellReach(i, p.view(b, cell, cell.Base), p.view(a, cell, cell.Target), cell, longest)...)
		}
		k.reach = align.Union(k.reach)
		found = append(found, k.reach...)
	}
	return align.Union(found)
}

// window finds rows near a stretch: of a long route with thousands of changes, each
// stretch has to do with a few.
type window struct {
	rows    []profile.Bound // in the order of the track
	ends    []unit.Distance // the greatest end so far, of each row and those before it
	longest unit.Distance
}

func newWindow(rows []profile.Bound, longest unit.Distance) window {
	w := window{rows, make([]unit.Distance, len(rows)), longest}
	for i, r := range rows {
		w.ends[i] = r.End
		if i > 0 {
			w.ends[i] = max(r.End, w.ends[i-1])
		}
	}
	return w
}

// near gives the rows that can bind a train on a stretch, and perhaps some more.
func (w *window) near(from, to unit.Distance) []profile.Bound {
	first := sort.Search(len(w.ends), func(i int) bool { return w.ends[i]+w.longest > from })
	end := sort.Search(len(w.rows), func(i int) bool { return w.rows[i].Start-w.longest >= to })
	return w.rows[min(first, end):end]
}

// view shifts rows so that the cell begins at 0, and turns them round for the
// reverse direction, so that the train always runs towards higher numbers.
func (p *pair) view(rows []profile.Bound, cell align.Cell, start unit.Distance) []profile.Bound {
	out := make([]profile.Bound, len(rows))
	for i, r := range rows {
		r.Start, r.End = r.Start-start, r.End-start
		if p.direction == codes.Reverse {
			r.Start, r.End = cell.Length-r.End, cell.Length-r.Start
		}
		out[i] = r
	}
	return out
}

// place gives the way back from a view to the target's track.
func (p *pair) place(cell align.Cell, from, to unit.Distance) align.Interval {
	if p.direction == codes.Reverse {
		from, to = cell.Length-to, cell.Length-from
	}
	return align.Interval{From: cell.Target + from, To: cell.Target + to}
}

// cellReach finds the reach of a kind of trains within one cell, of which the rows
// are views.
func (p *pair) cellReach(kind int, before, after []profile.Bound, cell align.Cell, longest unit.Distance) []align.Interval {
	zone := differing(before, after, p.direction, longest)
	if len(zone) == 0 {
		return nil
	}
	cuts := []unit.Distance{0, cell.Length}
	for _, rows := range [...][]profile.Bound{before, after} {
		for _, r := range rows {
			for _, s := range [...]unit.Distance{r.Start, r.End} {
				if s > 0 && s < cell.Length {
					cuts = append(cuts, s)
				}
			}
		}
	}
	slices.Sort(cuts)
	cuts = slices.Compact(cuts)
	heldBefore, heldAfter := holding(before, cuts), holding(after, cuts)
	behindBefore, behindAfter := byEnd(before), byEnd(after)
	var found []align.Interval
	for i := range len(cuts) - 1 {
		from, to := cuts[i], cuts[i+1]
		if !align.Touches(zone, from, to) {
			continue
		}
		if end := seenUntil(heldBefore[i], heldAfter[i], behindBefore, behindAfter, from, to, longest); end > from {
			at := p.place(cell, from, end)
			found = append(found, at)
			for _, s := range p.lengthsBetween(heldBefore[i], heldAfter[i], behindBefore, behindAfter, from, to) {
				s.kind, s.at = kind, at
				p.between = append(p.between, s)
			}
		}
	}
	return found
}

// seenUntil gives the end of the part of from <= x < to in which some train
// sees a difference; from itself where none does. No row begins or ends inside;
// b and a are the lowest speeds of the rows that hold there.
func seenUntil(b, a unit.Speed, behindBefore, behindAfter []profile.Bound, from, to, longest unit.Distance) unit.Distance {
	if b != a {
		return to
	}
	// Rows that end ahead of from hold already or not at all.
	i, k := firstBehind(behindBefore, from), firstBehind(behindAfter, from)
	for {
		if i == len(behindBefore) && k == len(behindAfter) {
			return from
		}
		end := from - longest // any lower end cannot be reached
		if i < len(behindBefore) {
			end = max(end, behindBefore[i].End)
		}
		if k < len(behindAfter) {
			end = max(end, behindAfter[k].End)
		}
		if end <= from-longest {
			return from
		}
		for i < len(behindBefore) && behindBefore[i].End == end {
			b = min(b, behindBefore[i].Speed)
			i++
		}
		for k < len(behindAfter) && behindAfter[k].End == end {
			a = min(a, behindAfter[k].Speed)
			k++
		}
		if b != a {
			return min(to, end+longest)
		}
	}
}

// firstBehind gives the index of the first row, in the order of byEnd, that does
// not end ahead of a place.
func firstBehind(rows []profile.Bound, from unit.Distance) int {
	i, _ := slices.BinarySearchFunc(rows, from, func(r profile.Bound, from unit.Distance) int { return cmp.Compare(from, r.End) })
	return i
}

// holding gives, for each stretch between two cuts, the lowest speed of the rows
// that cover it. Rows begin and end at cuts or outside them.
func holding(rows []profile.Bound, cuts []unit.Distance) []unit.Speed {
	held := make([]unit.Speed, len(cuts)-1)
	// The lowest row comes first, so a stretch is settled by the first row that
	// covers it; open leads from a settled stretch to the next that is not.
	open := make([]int, len(cuts))
	for i := range open {
		open[i] = i
	}
	next := func(i int) int {
		for open[i] != i {
			open[i] = open[open[i]]
			i = open[i]
		}
		return i
	}
	for i := range held {
		held[i] = profile.NoMaximum
	}
	sorted := slices.Clone(rows)
	slices.SortFunc(sorted, func(a, b profile.Bound) int { return cmp.Compare(a.Speed, b.Speed) })
	for _, r := range sorted {
		first, _ := slices.BinarySearch(cuts, r.Start)
		for i := first; i < len(cuts)-1; i++ {
			if i = next(i); i == len(cuts)-1 || cuts[i+1] > r.End {
				break
			}
			held[i], open[i] = r.Speed, i+1
		}
	}
	return held
}

// byEnd lists the delayed rows, the one that ends last first.
func byEnd(rows []profile.Bound) []profile.Bound {
	var list []profile.Bound
	for _, r := range rows {
		if r.Delay {
			list = append(list, r)
		}
	}
	slices.SortFunc(list, func(a, b profile.Bound) int { return cmp.Compare(b.End, a.End) })
	return list
}

// differing lists where rows that only one side has can hold for a train up to
// the longest. Elsewhere both sides have the same rows, and the same speeds.
func differing(before, after []profile.Bound, d codes.Direction, longest unit.Distance) []align.Interval {
	// The order of the compilers, which view has turned round.
	compare := func(a, b *profile.Bound) int {
		if d == codes.Reverse {
			return cmp.Or(cmp.Compare(b.End, a.End), cmp.Compare(b.Start, a.Start))
		}
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.End, b.End))
	}
	same := func(a, b *profile.Bound) bool { return *a == *b }
	return align.Unshared(before, after, compare, same, func(r *profile.Bound) align.Interval {
		if r.Delay {
			return align.Interval{From: r.Start, To: r.End + longest}
		}
		return align.Interval{From: r.Start, To: r.End}
	})
}
