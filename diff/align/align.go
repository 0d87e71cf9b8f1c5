// Package align lays the tracks of two revisions of a route side by side.
//
// Points are the same when their chainage and its occurrence are the same,
// whatever their running distances: what the posts read is what both revisions
// and the people on the track share. A chainage that only one of them has is
// added or removed track.
//
//	a := align.Tracks(base, target)
//	a.Common // [{Base: 0, Target: 0, Length: 1200000}]: the first 1.2 km
package align

import (
	"cmp"
	"slices"

	"speedtrail/schema/chainage"
	"speedtrail/schema/unit"
)

// Cell is a stretch that both tracks have, without a joint of either track
// that the other lacks.
type Cell struct {
	Base, Target unit.Distance // running distances of its beginning
	Length       unit.Distance // the same on both sides
}

// Continues tells whether next follows c without a break on both tracks. A
// chainage jump that both revisions have is no break.
func (c Cell) Continues(next Cell) bool {
	return c.Base+c.Length == next.Base && c.Target+c.Length == next.Target
}

// Interval is a stretch of one track, in running distances.
type Interval struct{ From, To unit.Distance }

// Alignment is what two tracks have in common and what only one of them has.
// Together, the cells and intervals of a side cover its track exactly once.
type Alignment struct {
	Common  []Cell     // in the order of the target's track
	Added   []Interval // on the target's track, in its order
	Removed []Interval // on the base's track, in its order
}

// Tracks aligns two tracks.
func Tracks(base, target *chainage.Track) Alignment {
	cuts := breakpoints(base, target)
	places := occurrences(base, cuts)
	seen := make([]int, len(cuts))
	var a Alignment
	for _, seg := range target.Segments() {
		for i := index(cuts, seg.From); cuts[i] < seg.To; i++ {
			length := cuts[i+1] - cuts[i]
			at := seg.Start + cuts[i] - seg.From
			n := seen[i]
			seen[i]++
			if n >= len(places[i]) {
				a.Added = appendInterval(a.Added, Interval{at, at + length})
				continue
			}
			a.Common = appendCell(a.Common, Cell{places[i][n], at, length})
		}
	}
	for _, seg := range base.Segments() {
		for i := index(cuts, seg.From); cuts[i] < seg.To; i++ {
			at := seg.Start + cuts[i] - seg.From
			if n := slices.Index(places[i], at); n >= seen[i] {
				a.Removed = appendInterval(a.Removed, Interval{at, at + cuts[i+1] - cuts[i]})
			}
		}
	}
	return a
}

// breakpoints lists the chainages at which a segment of either track begins or
// ends: between two of them, the number of occurrences is constant.
func breakpoints(tracks ...*chainage.Track) []unit.Distance {
	var cuts []unit.Distance
	for _, t := range tracks {
		for _, s := range t.Segments() {
			cuts = append(cuts, s.From, s.To)
		}
	}
	slices.Sort(cuts)
	return slices.Compact(cuts)
}

func index(cuts []unit.Distance, km unit.Distance) int {
	i, _ := slices.BinarySearch(cuts, km)
	return i
}

// occurrences lists, for the chainages between two cuts, the running distances
// at which they begin, in the order of the track.
func occurrences(t *chainage.Track, cuts []unit.Distance) [][]unit.Distance {
	places := make([][]unit.Distance, len(cuts))
	for _, s := range t.Segments() {
		for i := index(cuts, s.From); cuts[i] < s.To; i++ {
			places[i] = append(places[i], s.Start+cuts[i]-s.From)
		}
	}
	return places
}

func appendCell(cells []Cell, c Cell) []Cell {
	if n := len(cells); n > 0 && cells[n-1].Continues(c) {
		cells[n-1].Length += c.Length
		return cells
	}
	return append(cells, c)
}

// Union joins intervals that overlap or touch, in order. It alters the list.
func Union(list []Interval) []Interval {
	slices.SortFunc(list, func(a, b Interval) int { return cmp.Or(cmp.Compare(a.From, b.From), cmp.Compare(a.To, b.To)) })
	var out []Interval
	for _, i := range list {
		if n := len(out); n > 0 && i.From <= out[n-1].To {
			out[n-1].To = max(out[n-1].To, i.To)
			continue
		}
		out = append(out, i)
	}
	return out
}

// Touches tells whether one of the intervals of a Union has a part of from <= x < to.
func Touches(union []Interval, from, to unit.Distance) bool {
	i, _ := slices.BinarySearchFunc(union, from, func(x Interval, from unit.Distance) int {
		if x.To > from {
			return 1
		}
		return -1
	})
	return i < len(union) && union[i].From < to
}

// Whole tells whether two tracks have everything in common, laid side by side
// as they are.
func (a *Alignment) Whole() bool {
	return len(a.Common) == 1 && a.Common[0].Base == 0 && a.Common[0].Target == 0 && len(a.Added) == 0 && len(a.Removed) == 0
}

func appendInterval(list []Interval, i Interval) []Interval {
	if n := len(list); n > 0 && list[n-1].To == i.From {
		list[n-1].To = i.To
		return list
	}
	return append(list, i)
}
