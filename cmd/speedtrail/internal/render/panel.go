package render

import (
	"cmp"
	"math"
	"slices"

	"speedtrail/history/assessment"
)

const (
	// mostPanelChanges is how many changes a chart shows before their labels and
	// numbers run into each other.
	mostPanelChanges = 8
	// A gap is long against the changes beside it from this factor on, and from this
	// length on it is worth a chart of its own.
	longGap      = 5
	leastLongGap = 200_000
	// leastMargin is the track that a chart shows beside a change of some length, in
	// millimetres; of a very short one, as many times its own length.
	leastMargin   = 300_000
	shortestShare = 20
)

// panel is a part of a stretch that has a chart of its own.
type panel struct {
	From, To             int64 // what belongs to it, by running distance
	Changes              []int // indices in Route.Changes
	WindowFrom, WindowTo int64
}

// panels cuts the changes of a stretch into charts: where unchanged track between
// two changes is long against them, and where they are many.
func panels(r *assessment.Route, s *assessment.Stretch) []panel {
	changes := slices.Clone(s.Changes)
	slices.SortStableFunc(changes, func(a, b int) int { return cmp.Compare(r.Changes[a].Start, r.Changes[b].Start) })
	start := func(i int) int64 { return r.Changes[changes[i]].Start }
	end := func(i int) int64 { return start(i) + r.Changes[changes[i]].Length }
	var list []panel
	first := 0
	cut := func(next int) {
		list = append(list, panel{From: start(first), To: end(next - 1), Changes: changes[first:next]})
		first = next
	}
	// A run-out goes with the change that it touches.
	weight := func(i int) int {
		if r.Changes[changes[i]].RunOut && (i > 0 && start(i) <= end(i-1) || i+1 < len(changes) && start(i+1) <= end(i)) {
			return 0
		}
		return 1
	}
	gap := func(i int) int64 { return start(i) - end(i-1) }
	for i := 1; i < len(changes); i++ {
		if near := min(end(i-1)-start(first), end(i)-start(i)); gap(i) >= leastLongGap && gap(i) > longGap*near {
			crowded(first, i, weight, gap, cut)
		}
	}
	if len(changes) > 0 {
		crowded(first, len(changes), weight, gap, cut)
	}
	for i := range list {
		p := &list[i]
		span := p.To - p.From
		margin := span / 2
		if len(list) > 1 { // the other charts show the rest
			margin = span / 8
		}
		margin = max(margin, min(leastMargin, shortestShare*span))
		p.WindowFrom, p.WindowTo = max(s.WindowFrom, p.From-margin), min(s.WindowTo, p.To+margin)
	}
	// What other trains see between two charts belongs to the nearer one.
	for i := 1; i < len(list); i++ {
		middle := (list[i-1].To + list[i].From) / 2
		list[i-1].To, list[i].From = middle, middle
	}
	if n := len(list); n > 0 {
		list[0].From, list[n-1].To = math.MinInt64, math.MaxInt64
	}
	return list
}

// crowded cuts the changes from first to before end into charts of about equal
// weight, in the largest gap near by. gap is the track before a change.
func crowded(first, end int, weight func(int) int, gap func(int) int64, cut func(int)) {
	rest := 0
	for i := first; i < end; i++ {
		rest += weight(i)
	}
	for rest > mostPanelChanges {
		charts := (rest + mostPanelChanges - 1) / mostPanelChanges
		size := (rest + charts - 1) / charts
		best, bestWeight := 0, 0
		for i, w := first+1, weight(first); i < end && w <= mostPanelChanges; i++ {
			if w >= size-2 && (best == 0 || gap(i) > gap(best) || gap(i) == gap(best) && w <= size) {
				best, bestWeight = i, w
			}
			w += weight(i)
		}
		cut(best)
		first, rest = best, rest-bestWeight
	}
	cut(end)
}

// holds tells whether a change belongs to a panel.
func (p *panel) holds(x *assessment.Change) bool {
	middle := x.Start + x.Length/2
	return middle >= p.From && middle < p.To
}
