package diff

import (
	"cmp"
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
	behind         bool                 // the row itself ends before, in the direction of travel
}

// dated lists such stretches in one direction of travel, in the order of the track. What
// lies behind a row that is named, for the length of a train, goes with it.
func (r *Route) dated(d codes.Direction, cells []align.Cell, trains []Train) []Dated {
	list := r.datedAnywhere(d, cells, trains)
	if d == codes.Reverse {
		slices.Reverse(list)
	}
	var out []Dated
	end, last := unit.Distance(-1), Dated{}
	for _, x := range list {
		from, to := x.From, x.To
		if d == codes.Reverse {
			from, to = -x.To, -x.From
		}
		if !(x.behind && from == end && x.Row == last.Row && (last.Faster || !x.Faster) && (last.Slower || !x.Slower)) {
			out, last = append(out, x), x
		}
		end = to
	}
	if d == codes.Reverse {
		slices.Reverse(out)
	}
	return out
}

// datedAnywhere lists the stretches for a train without length and for the length of
// each reference train: behind the end of a restriction another one can hold, and end
// at another time.
func (r *Route) datedAnywhere(d codes.Direction, cells []align.Cell, trains []Train) []Dated {
	if len(r.Base.Temporary) == 0 && len(r.Target.Temporary) == 0 {
		return nil
	}
	lengths := []unit.Distance{0}
	for i := range trains {
		lengths = append(lengths, trains[i].Length)
	}
	slices.Sort(lengths)
	lengths = slices.Compact(lengths)
	var list []Dated
	for _, cell := range cells {
		if r.sameRestrictions(cell.Target - cell.Base) {
			continue // for every length
		}
		of := make([][]Dated, len(lengths))
		for i, length := range lengths {
			of[i] = datedFor(d, termsOn(r.Base, d, length, cell.Base, cell), termsOn(r.Target, d, length, cell.Target, cell))
		}
		for _, x := range together(of) {
			if n := len(list) - 1; n >= 0 && list[n].continues(x) {
				list[n].To = x.To
				continue
			}
			list = append(list, x)
		}
	}
	return list
}

// sameRestrictions tells whether both sides have the same temporary restrictions, those
// of the base moved along the track, in the same order.
func (r *Route) sameRestrictions(moved unit.Distance) bool {
	return slices.EqualFunc(r.Base.Temporary, r.Target.Temporary, func(a, b schema.TemporaryRow) bool {
		return a.Start+moved == b.Start && a.End+moved == b.End && a.Directions == b.Directions && said(&a) == said(&b)
	})
}

// datedFor lists the stretches of a cell for trains of one length, by the restrictions
// that hold these on the two sides.
func datedFor(d codes.Direction, base, target []term) []Dated {
	if slices.EqualFunc(base, target, func(a, b term) bool { return a.from == b.from && a.to == b.to && a.says == b.says }) {
		return nil
	}
	var list []Dated
	cuts := differing([2][]term{base, target})
	before, after := running{rest: base}, running{rest: target}
	for i := 1; i < len(cuts); i++ {
		x := Dated{Direction: d, From: cuts[i-1], To: cuts[i]}
		switch n := len(list) - 1; {
		case !x.compare(before.at(x.From), after.at(x.From)):
		case n >= 0 && list[n].continues(x):
			list[n].To = x.To
		default:
			list = append(list, x)
		}
	}
	return list
}

// continues tells whether a stretch goes on where one ends and says the same.
func (x *Dated) continues(next Dated) bool {
	return x.To == next.From && x.Row == next.Row && x.Faster == next.Faster && x.Slower == next.Slower && x.behind == next.behind
}

// together lays the stretches of trains of different lengths over each other: what one
// of them does is said, with the row of the shortest.
func together(of [][]Dated) []Dated {
	var cuts []unit.Distance
	for _, list := range of {
		for i := range list {
			cuts = append(cuts, list[i].From, list[i].To)
		}
	}
	slices.Sort(cuts)
	cuts = slices.Compact(cuts)
	var out []Dated
	for i := 1; i < len(cuts); i++ {
		var all *Dated
		for k := range of {
			for len(of[k]) > 0 && of[k][0].To <= cuts[i-1] {
				of[k] = of[k][1:]
			}
			switch {
			case len(of[k]) == 0 || of[k][0].From > cuts[i-1]:
			case all == nil:
				x := of[k][0]
				x.From, x.To, all = cuts[i-1], cuts[i], &x
			default:
				all.Faster, all.Slower = all.Faster || of[k][0].Faster, all.Slower || of[k][0].Slower
			}
		}
		switch n := len(out) - 1; {
		case all == nil:
		case n >= 0 && out[n].continues(*all):
			out[n].To = all.To
		default:
			out = append(out, *all)
		}
	}
	return out
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
			return row != nil && row.Directions.Has(x.Direction) && (row.Start < x.To && x.From < row.End || !x.OfBase && line == x.Row.Pos.Line)
		})
	})
}

// term is a temporary restriction on a part of the target's track.
type term struct {
	from, to unit.Distance
	*schema.TemporaryRow
	says saying
	own  align.Interval // without the length of a train
}

// saying is what a restriction says where it holds: two that say the same are alike.
type saying struct {
	speed       unit.Speed
	delay       bool
	from, until time.Time
}

func said(r *schema.TemporaryRow) saying {
	return saying{r.Speed, r.Delay, r.Valid.From.UTC(), r.Valid.Until.UTC()}
}

// termsOn lists the restrictions of a side that hold a train of a length on a cell, in
// the order of where they begin.
func termsOn(r *schema.Route, d codes.Direction, length, start unit.Distance, cell align.Cell) []term {
	var list []term
	for i := range r.Temporary {
		row := &r.Temporary[i]
		from, to := row.Start, row.End
		switch {
		case row.Delay && d == codes.Reverse:
			from -= length
		case row.Delay:
			to += length
		}
		there := cell.Target - start // from here to the target's track
		from, to = max(from, start)+there, min(to, start+cell.Length)+there
		if row.Directions.Has(d) && from < to {
			list = append(list, term{from, to, row, said(row), align.Interval{From: row.Start + there, To: row.End + there}})
		}
	}
	slices.SortStableFunc(list, func(a, b term) int { return cmp.Compare(a.from, b.from) })
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
	var reach []align.Interval
	var cuts []unit.Distance
	for side, list := range sides {
		has[side] = map[placed]bool{}
		for _, t := range list {
			has[side][placed{align.Interval{From: t.from, To: t.to}, t.says}] = true
			for _, end := range [...]unit.Distance{t.own.From, t.own.To} {
				if t.from < end && end < t.to {
					cuts = append(cuts, end)
				}
			}
		}
	}
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

// running gives the restrictions at one place after the other.
type running struct{ here, rest []term }

func (r *running) at(place unit.Distance) []term {
	r.here = slices.DeleteFunc(r.here, func(t term) bool { return t.to <= place })
	for len(r.rest) > 0 && r.rest[0].from <= place {
		if r.rest[0].to > place {
			r.here = append(r.here, r.rest[0])
		}
		r.rest = r.rest[1:]
	}
	return r.here
}

// compare fills in what the restrictions of a place do that the changes do not say, and
// tells whether they do.
func (x *Dated) compare(base, target []term) bool {
	row := only(target, base)
	if row == nil {
		row, x.OfBase = only(base, target), true
	}
	if row == nil {
		return false
	}
	x.Row, x.behind = row.TemporaryRow, x.From >= row.own.To || x.To <= row.own.From
	before, after := lowest(base, nil), lowest(target, nil)
	for _, at := range instants([2][]term{base, target}) {
		was, is := lowest(base, &at), lowest(target, &at)
		// A raise to what the changes say is told by them, one to more is not: 40 km/h
		// for a year that become 45 for a day are no raise by 5.
		x.Faster = x.Faster || is > was && is > after
		x.Slower = x.Slower || is < was && after >= before
	}
	return x.Faster || x.Slower
}

// only gives the first restriction that the other side does not have, nil for none.
func only(list, other []term) *term {
	for i := range list {
		if !slices.ContainsFunc(other, func(u term) bool { return list[i].says == u.says }) {
			return &list[i]
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
