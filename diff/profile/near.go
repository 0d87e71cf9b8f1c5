package profile

import (
	"cmp"
	"slices"
	"sort"

	"speedtrail/diff/align"
	"speedtrail/schema/unit"
)

// extent gives where a row can hold for a train up to the longest: with train
// length delay, one length further in the direction of travel.
func (c *Compiler) extent(r *restriction, longest unit.Distance) align.Interval {
	i := align.Interval{From: r.start, To: r.end}
	if r.delay {
		before, after := c.shifts(longest)
		i.From, i.To = i.From-before, i.To+after
	}
	return i
}

// Narrow takes two sides of the same track and gives compilers of the rows that
// can matter to a difference between them, with the stretches outside which no
// train up to the longest sees one: there both sides have the same rows. Inside,
// the compilers give what the whole ones give; outside, they must not be asked.
func Narrow(base, target *Compiler, longest unit.Distance) (b, t *Compiler, near []align.Interval) {
	near = differing(base, target, longest)
	inside := func(i align.Interval) bool { return align.Touches(near, i.From, i.To) }
	return base.part(longest, inside), target.part(longest, inside), near
}

// differing lists where rows that only one side has can hold, in order and
// without overlap. Rows that differ in what people read alone are the same.
func differing(base, target *Compiler, longest unit.Distance) []align.Interval {
	length := base.route.Track.Length()
	same := func(r, s *restriction) bool { return base.sameCells(r, target, s) }
	return align.Unshared(base.rows, target.rows, comparePlace, same, func(r *restriction) align.Interval {
		i := base.extent(r, longest)
		return align.Interval{From: max(0, i.From), To: min(length, i.To)}
	})
}

// comparePlace compares by what rows are sorted by, their lines aside.
func comparePlace(a, b *restriction) int {
	return cmp.Or(cmp.Compare(a.start, b.start), cmp.Compare(a.end, b.end), cmp.Compare(a.layer, b.layer))
}

// sameCells tells whether two rows of one place restrict every train alike.
func (c *Compiler) sameCells(r *restriction, d *Compiler, s *restriction) bool {
	if r.delay != s.delay {
		return false
	}
	switch r.layer {
	case StaticSpeed:
		a, b := &c.route.Speed[r.row], &d.route.Speed[s.row]
		return a.Basic == b.Basic && a.Cant == b.Cant && a.Other == b.Other && a.Replaces == b.Replaces
	case AxleLoad:
		return c.route.AxleLoad[r.row].Limit == d.route.AxleLoad[s.row].Limit
	}
	return c.route.Temporary[r.row].Speed == d.route.Temporary[s.row].Speed
}

// Window gives a compiler of the rows that can hold between two distances for a
// train up to the longest. There it gives what the whole one gives. It looks at those
// rows only, but for long ones before them.
func (c *Compiler) Window(from, to, longest unit.Distance) *Compiler {
	p := &Compiler{route: c.route, direction: c.direction}
	before, after := c.shifts(longest)
	first := sort.Search(len(c.latest), func(i int) bool { return c.latest[i]+after > from })
	for i := first; i < len(c.rows) && c.rows[i].start-before < to; i++ {
		if x := c.extent(&c.rows[i], longest); x.From < to && from < x.To {
			p.rows = append(p.rows, c.rows[i])
		}
	}
	p.prepare()
	return p
}

// Permanent gives a compiler of the rows that are not temporary restrictions.
func (c *Compiler) Permanent() *Compiler {
	return c.only(func(r *restriction) bool { return r.layer != Temporary })
}

// HasTemporary tells whether there are temporary restrictions among the rows.
func (c *Compiler) HasTemporary() bool {
	return slices.ContainsFunc(c.rows, func(r restriction) bool { return r.layer == Temporary })
}

func (c *Compiler) part(longest unit.Distance, keep func(align.Interval) bool) *Compiler {
	return c.only(func(r *restriction) bool { return keep(c.extent(r, longest)) })
}

// only gives a compiler of some of the rows. Their order is the same, so that
// nothing has to be sorted again.
func (c *Compiler) only(keep func(*restriction) bool) *Compiler {
	p := &Compiler{route: c.route, direction: c.direction}
	number := make([]int32, len(c.rows)) // of the row in the part; -1: left out
	for i := range c.rows {
		number[i] = -1
		if keep(&c.rows[i]) {
			number[i] = int32(len(p.rows))
			p.rows = append(p.rows, c.rows[i])
		}
	}
	renumber := func(ends []rowEnd) []rowEnd {
		var list []rowEnd
		for _, e := range ends {
			if e.row = number[e.row]; e.row >= 0 {
				list = append(list, e)
			}
		}
		return list
	}
	p.fixed, p.moved, p.latest = renumber(c.fixed), renumber(c.moved), latestOf(p.rows)
	return p
}
