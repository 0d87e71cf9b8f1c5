package schema

import (
	"cmp"
	"slices"

	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// coverage checks that the rows of speed.csv cover the route exactly in each
// direction of travel: the basic speed is always given (SUBSET-026
// 3.11.3.2.2 a).
func (r *reader) coverage(route *Route) {
	whole := codes.Both
	var gaps [2][]gap
	for _, d := range codes.AllDirections {
		if route.Directions.Has(d) {
			gaps[d] = coverageOf(route, d)
		} else {
			whole &^= 1 << d
		}
	}
	// What can be done about a gap is said once, at the first one.
	hinted := source.Position{}
	for _, list := range gaps {
		for _, g := range list {
			if at := route.Speed[g.row].Pos; !g.overlap && (hinted.Line == 0 || at.Compare(hinted) < 0) {
				hinted = at
			}
		}
	}
	// What is wrong in both directions alike is said once.
	same := whole == codes.Both && slices.Equal(gaps[codes.Nominal], gaps[codes.Reverse])
	for _, d := range codes.AllDirections {
		if same && d == codes.Reverse {
			break
		}
		direction := ""
		if !same {
			direction = " in direction " + d.String()
		}
		for _, g := range gaps[d] {
			at := route.Speed[g.row].Pos
			from, to := route.Track.Begins(g.from), route.Track.Ends(g.to)
			if g.overlap {
				other := route.Speed[g.other].Pos
				r.faults.Add(at, "the row overlaps that of line %d%s from %s to %s, each place has one row", other.Line, direction, from, to)
				continue
			}
			hint := ""
			if at == hinted {
				hint, hinted = ", the basic speed is always given (SUBSET-026 3.11.3.2.2); where posts alone are missing or repeat, write a [[jump]] in route.toml; where track is, make a second route", source.Position{}
			}
			r.faults.Add(at, "no row covers %s to %s%s%s", from, to, direction, hint)
		}
	}
}

// gap is a stretch that no row covers, or that two rows do. row is where it is
// reported: the row after a gap, or the last one; the later row of an overlap.
type gap struct {
	from, to   unit.Distance
	row, other int
	overlap    bool
}

func coverageOf(route *Route, d codes.Direction) []gap {
	if coveredInOrder(route, d) {
		return nil
	}
	var order []int
	for i := range route.Speed {
		if route.Speed[i].Directions.Has(d) {
			order = append(order, i)
		}
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(route.Speed[a].Start, route.Speed[b].Start) })
	var gaps []gap
	at, last := unit.Distance(0), 0
	for _, i := range order {
		row := &route.Speed[i]
		switch {
		case row.Start > at:
			gaps = append(gaps, gap{from: at, to: row.Start, row: i})
		case row.Start < at:
			gaps = append(gaps, gap{from: row.Start, to: min(at, row.End), row: max(i, last), other: min(i, last), overlap: true})
		}
		if row.End > at {
			at, last = row.End, i
		}
	}
	if at < route.Track.Length() {
		gaps = append(gaps, gap{from: at, to: route.Track.Length(), row: last})
	}
	return gaps
}

// coveredInOrder tells whether the rows cover the route one after the other in
// the order of the file, as those of most tables do.
func coveredInOrder(route *Route, d codes.Direction) bool {
	at := unit.Distance(0)
	for i := range route.Speed {
		row := &route.Speed[i]
		if !row.Directions.Has(d) {
			continue
		}
		if row.Start != at {
			return false
		}
		at = row.End
	}
	return at == route.Track.Length()
}

// disjoint checks that rows of which one place has only one do not overlap.
func (r *reader) disjoint(route *Route, rows []*Row, what string) {
	slices.SortStableFunc(rows, func(a, b *Row) int { return cmp.Compare(a.Start, b.Start) })
	var furthest *Row
	for _, row := range rows {
		if furthest != nil && row.Start < furthest.End {
			r.faults.Add(row.Pos, "the %s overlaps that of line %d from %s", what, furthest.Pos.Line, route.Track.Begins(row.Start))
		}
		if furthest == nil || row.End > furthest.End {
			furthest = row
		}
	}
}
