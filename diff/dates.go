package diff

import (
	"slices"
	"time"

	"speedtrail/diff/align"
	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Dated is a stretch on which temporary restrictions let trains go faster or slower at
// some time than those of the base did at that time, and the changes do not say so: for
// them all restrictions count, whatever their dates. One that ends earlier is no change,
// or none but that of its speed, and on the track it lets trains go faster.
type Dated struct {
	Direction      codes.Direction
	From, To       unit.Distance // running distance on the target's track
	Faster, Slower bool
	Row            *schema.TemporaryRow // the first that the other side does not have there
	OfBase         bool                 // that row is the base's
}

// dated lists such stretches in one direction of travel, in the order of the track.
func (r *Route) dated(d codes.Direction, cells []align.Cell) []Dated {
	var list []Dated
	for _, cell := range cells {
		sides := [2][]term{termsOn(r.Base, d, cell.Base, cell), termsOn(r.Target, d, cell.Target, cell)}
		cuts := differing(sides)
		for i := 1; i < len(cuts); i++ {
			x := Dated{Direction: d, From: cuts[i-1], To: cuts[i]}
			if !x.compare(holding(sides[0], x.From), holding(sides[1], x.From)) {
				continue
			}
			if n := len(list); n > 0 && list[n-1].To == x.From && list[n-1].Row == x.Row && list[n-1].Faster == x.Faster && list[n-1].Slower == x.Slower {
				list[n-1].To = x.To
				continue
			}
			list = append(list, x)
		}
	}
	return list
}

// datedBy tells whether one of some rows, by their lines on both sides, has a part in
// such a stretch.
func (r *Route) datedBy(old, now []int) bool {
	return slices.ContainsFunc(r.Dated, func(x Dated) bool {
		if x.OfBase && slices.Contains(old, x.Row.Pos.Line) {
			return true
		}
		return slices.ContainsFunc(now, func(line int) bool {
			row := anyRow(r.Target, profile.Temporary, line)
			return row != nil && row.Directions.Has(x.Direction) && row.Start < x.To && x.From < row.End
		})
	})
}

// term is a temporary restriction on a part of the target's track.
type term struct {
	from, to unit.Distance
	*schema.TemporaryRow
}

// saying is what a restriction says where it holds: two that say the same are alike.
type saying struct {
	speed       unit.Speed
	delay       bool
	from, until time.Time
}

func (t term) says() saying { return saying{t.Speed, t.Delay, t.Valid.From.UTC(), t.Valid.Until.UTC()} }

// termsOn lists the restrictions of a side that hold on a cell.
func termsOn(r *schema.Route, d codes.Direction, start unit.Distance, cell align.Cell) []term {
	var list []term
	for i := range r.Temporary {
		row := &r.Temporary[i]
		from, to := max(row.Start, start)-start+cell.Target, min(row.End, start+cell.Length)-start+cell.Target
		if row.Directions.Has(d) && from < to {
			list = append(list, term{from, to, row})
		}
	}
	return list
}

// differing gives where restrictions begin and end on the part of the track that those
// reach over which only one side has; two neighbours of these places stand for the
// stretch between.
func differing(sides [2][]term) []unit.Distance {
	type placed struct {
		align.Interval
		saying saying
	}
	var has [2]map[placed]bool
	for side, list := range sides {
		has[side] = map[placed]bool{}
		for _, t := range list {
			has[side][placed{align.Interval{From: t.from, To: t.to}, t.says()}] = true
		}
	}
	var reach []align.Interval
	var cuts []unit.Distance
	for side := range sides {
		for x := range has[side] {
			cuts = append(cuts, x.From, x.To)
			if !has[1-side][x] {
				reach = append(reach, x.Interval)
			}
		}
	}
	reach = align.Union(reach)
	slices.Sort(cuts)
	return slices.DeleteFunc(slices.Compact(cuts), func(at unit.Distance) bool { return !align.Touches(reach, at-1, at+1) })
}

// holding lists the restrictions at a place.
func holding(list []term, at unit.Distance) (here []term) {
	for _, t := range list {
		if t.from <= at && at < t.to {
			here = append(here, t)
		}
	}
	return here
}

// compare fills in what the restrictions of a place do, and tells whether that has to
// be said. Those that hold until the rear of a train has left are looked at once more
// by themselves: behind their end, they alone hold.
func (x *Dated) compare(base, target []term) bool {
	delayed := func(list []term) []term {
		return slices.DeleteFunc(slices.Clone(list), func(t term) bool { return !t.Delay })
	}
	for _, pair := range [...][2][]term{{base, target}, {delayed(base), delayed(target)}} {
		before, after := lowest(pair[0], nil), lowest(pair[1], nil)
		for _, at := range instants(pair) {
			was, is := lowest(pair[0], &at), lowest(pair[1], &at)
			// A raise to what the changes say is told by them, one to more is not: 40 km/h
			// for a year that become 45 for a day are no raise by 5.
			x.Faster = x.Faster || is > was && is > after
			x.Slower = x.Slower || is < was && after >= before
		}
	}
	x.Row = only(target, base)
	if x.Row == nil {
		x.Row, x.OfBase = only(base, target), true
	}
	return x.Row != nil && (x.Faster || x.Slower)
}

// only gives the first restriction that the other side does not have, nil for none.
func only(list, other []term) *schema.TemporaryRow {
	for _, t := range list {
		if !slices.ContainsFunc(other, func(u term) bool { return t.says() == u.says() }) {
			return t.TemporaryRow
		}
	}
	return nil
}

// instants are the times from which on other restrictions hold, and one before all of
// them.
func instants(sides [2][]term) []time.Time {
	list := []time.Time{{}}
	for _, terms := range sides {
		for _, t := range terms {
			list = append(list, t.Valid.From, t.Valid.Until)
		}
	}
	return list
}

// lowest is the lowest speed of the restrictions that are in force at an instant, or of
// all, whatever their dates; above every speed where there is none.
func lowest(list []term, at *time.Time) unit.Speed {
	v := unit.MaxSpeed + unit.SpeedStep
	for _, t := range list {
		if at == nil || t.Valid.Overlaps(*at, *at) {
			v = min(v, t.Speed)
		}
	}
	return v
}
