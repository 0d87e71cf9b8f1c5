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
	// Until is the instant from which on they do not; zero where they do for ever.
	Until  time.Time
	Row    *schema.TemporaryRow // the first that the other side does not have there
	OfBase bool                 // that row is the base's
	behind bool                 // the row itself ends before, in the direction of travel
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
		} else {
			out[len(out)-1].Until = later(out[len(out)-1].Until, x.Until)
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
	cells = slices.DeleteFunc(slices.Clone(cells), func(c align.Cell) bool { return r.sameRestrictions(c.Target - c.Base) })
	if len(cells) == 0 {
		return nil // for every length
	}
	lengths := []unit.Distance{0}
	for i := range trains {
		lengths = append(lengths, trains[i].Length)
	}
	slices.Sort(lengths)
	lengths = slices.Compact(lengths)
	says, n, times := sayings(r.Base.Temporary, r.Target.Temporary)
	var list []Dated
	for _, cell := range cells {
		of := make([][]Dated, len(lengths))
		for i, length := range lengths {
			of[i] = datedFor(d, termsOn(r.Base, says[0], d, length, cell.Base, cell), termsOn(r.Target, says[1], d, length, cell.Target, cell), n, times)
		}
		for _, x := range together(of) {
			list = joinDated(list, x)
		}
	}
	return list
}

// sameRestrictions tells whether both sides have the same temporary restrictions, those
// of the base moved along the track, in the same order.
func (r *Route) sameRestrictions(moved unit.Distance) bool {
	return slices.EqualFunc(r.Base.Temporary, r.Target.Temporary, func(a, b schema.TemporaryRow) bool {
		return a.Start+moved == b.Start && a.End+moved == b.End && a.Directions == b.Directions &&
			a.Speed == b.Speed && a.Delay == b.Delay && a.Valid.From.Equal(b.Valid.From) && a.Valid.Until.Equal(b.Valid.Until)
	})
}

// datedFor lists the stretches of a cell for trains of one length, by the restrictions
// that hold these on the two sides, which say so many different things and name these
// instants.
func datedFor(d codes.Direction, base, target []term, sayings int, times []time.Time) []Dated {
	if slices.EqualFunc(base, target, func(a, b term) bool { return a.from == b.from && a.to == b.to && a.id == b.id }) {
		return nil
	}
	var list []Dated
	sides := [2][]term{base, target}
	cuts, p := differing(sides), newPlace(sides, sayings, times)
	for i := 1; i < len(cuts); i++ {
		x := Dated{Direction: d, From: cuts[i-1], To: cuts[i]}
		p.goTo(x.From)
		if x.compare(p) {
			list = joinDated(list, x)
		}
	}
	return list
}

// joinDated adds a stretch to a list, or to its last one, where that goes on.
func joinDated(list []Dated, x Dated) []Dated {
	n := len(list) - 1
	if n < 0 || !list[n].continues(x) {
		return append(list, x)
	}
	list[n].To, list[n].Until = x.To, later(list[n].Until, x.Until)
	return list
}

// later gives the later of two instants, of which zero is never.
func later(a, b time.Time) time.Time {
	if a.IsZero() || b.IsZero() {
		return time.Time{}
	}
	if a.After(b) {
		return a
	}
	return b
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
				all.Faster, all.Slower, all.Until = all.Faster || of[k][0].Faster, all.Slower || of[k][0].Slower, later(all.Until, of[k][0].Until)
			}
		}
		if all != nil {
			out = joinDated(out, *all)
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

// compare fills in what the restrictions of a place do that the changes do not say, and
// tells whether they do.
func (x *Dated) compare(p *place) bool {
	row := p.only(1)
	if row == nil {
		row, x.OfBase = p.only(0), true
	}
	if row == nil {
		return false
	}
	x.Row, x.behind = row.TemporaryRow, x.From >= row.own.To || x.To <= row.own.From
	before, after := p.all[0].lowest(), p.all[1].lowest()
	for now := range p.overTime() {
		// A raise to what the changes say is told by them, one to more is not: 40 km/h
		// for a year that become 45 for a day are no raise by 5.
		faster, slower := now.is > now.was && now.is > after, now.is < now.was && after >= before
		if faster || slower {
			x.Faster, x.Slower, x.Until = x.Faster || faster, x.Slower || slower, now.until
		}
	}
	return x.Faster || x.Slower
}
