package diff

import (
	"cmp"
	"slices"
	"sort"

	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/fleet"
	"speedtrail/diff/profile"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Fleet is the account of a route and direction of travel for every train that
// the standard can describe.
type Fleet struct {
	Direction codes.Direction
	// Permanent: without temporary restrictions. Then Changes holds those only
	// that are not the same with them.
	Permanent bool
	Shortest  unit.Distance // the lengths for which changes are given: those of
	Longest   unit.Distance // the shortest and of the longest reference train
	Changes   []FleetChange
	// Reach covers every point at which a train of any kind and any length up
	// to the longest sees a change; on the target's track.
	Reach []align.Interval
	// LeftOut is what only trains of lengths between see and Changes does not hold,
	// because it takes more lengths than are looked at.
	LeftOut fleet.LeftOut
}

// FleetChange is a change that products of category sets see.
type FleetChange struct {
	delta.Delta
	Lengths  []unit.Distance // of trains for which it was found, ascending
	Products []fleet.Product
	// Represented tells of each product whether a reference train of its
	// categories sees the change.
	Represented []bool
}

// fleet compares the sides for every train, with and without temporary
// restrictions.
func (p *pair) fleet(trains []Train) []Fleet {
	if len(trains) == 0 {
		return nil
	}
	lengths := make([]unit.Distance, len(trains))
	for i, t := range trains {
		lengths[i] = t.Length
	}
	shortest, longest := slices.Min(lengths), slices.Max(lengths)
	asked := slices.Compact([]unit.Distance{shortest, longest})
	var list []Fleet
	for _, permanent := range []bool{false, true} {
		s := p.all
		if permanent {
			if !p.hides {
				break
			}
			s = p.permanent
		}
		found := fleet.CompareSides(s.base, s.target, p.direction, s.cells, asked)
		f := Fleet{Direction: p.direction, Permanent: permanent, Shortest: shortest, Longest: longest, Reach: found.Reach, Changes: joinLengths(append(found.Changes, found.Between...)), LeftOut: found.LeftOut}
		if permanent {
			f.Changes = slices.DeleteFunc(f.Changes, func(c FleetChange) bool { return slices.ContainsFunc(list[0].Changes, c.same) })
			if f.LeftOut.Same(list[0].LeftOut) {
				f.LeftOut = fleet.LeftOut{}
			}
			if len(f.Changes) == 0 && len(f.LeftOut.Lengths) == 0 && slices.Equal(f.Reach, list[0].Reach) {
				break
			}
		}
		p.represent(&f, &found, s, trains)
		list = append(list, f)
	}
	return list
}

func (c FleetChange) same(d FleetChange) bool {
	return c.Delta == d.Delta && slices.Equal(c.Lengths, d.Lengths) && slices.Equal(c.Products, d.Products)
}

// joinLengths joins changes that trains of several lengths see alike.
func joinLengths(changes []fleet.Change) []FleetChange {
	var list []FleetChange
	for _, c := range changes {
		i := slices.IndexFunc(list, func(f FleetChange) bool { return f.Delta == c.Delta && slices.Equal(f.Products, c.Products) })
		if i < 0 {
			list = append(list, FleetChange{Delta: c.Delta, Lengths: []unit.Distance{c.TrainLength}, Products: c.Products})
			continue
		}
		list[i].Lengths = append(list[i].Lengths, c.TrainLength)
	}
	slices.SortStableFunc(list, func(a, b FleetChange) int {
		return cmp.Or(cmp.Compare(a.Target, b.Target), cmp.Compare(a.Length, b.Length), cmp.Compare(a.Before, b.Before), cmp.Compare(a.After, b.After))
	})
	return list
}

// shown is a change that a reference train shows: of its own, and as it would
// be without its maximum speed.
type shown struct {
	class    profile.Class
	from, to unit.Distance
	raised   bool
	// without a maximum speed, in the stretch of the reach:
	part          int
	before, after unit.Speed
}

// represent finds the products of which a reference train sees the change: it
// changes in the same sense on a part of the same place; or it sees, as far as
// its maximum speed lets it, the same speeds change elsewhere on the same stretch
// that trains of its kind see without a gap, where its length carries the change.
func (p *pair) represent(f *Fleet, found *fleet.Result, s sides, trains []Train) {
	partOf := func(class profile.Class, at unit.Distance) int {
		reach := found.ReachOf(class)
		i := sort.Search(len(reach), func(i int) bool { return reach[i].To > at })
		if i == len(reach) || at < reach[i].From {
			return -1
		}
		return i
	}
	var list []shown
	for i, t := range trains {
		class := profile.ClassOf(t.Train)
		seen := p.sights[i].changes
		if f.Permanent {
			// Not what it sees today: a change that a temporary restriction makes
			// stands for no permanent one.
			seen = s.compare(s.base.Select(class), s.target.Select(class), t.Length, t.Max)
		}
		if len(seen) == 0 {
			continue
		}
		free := s.compare(s.base.Select(class), s.target.Select(class), t.Length, profile.NoMaximum)
		for _, c := range seen {
			list = append(list, shown{class: class, from: c.Target, to: c.Target + c.Length, raised: c.After > c.Before, part: -1})
			for _, u := range free {
				if u.Target < c.Target+c.Length && c.Target < u.Target+u.Length && (u.After > u.Before) == (c.After > c.Before) {
					list = append(list, shown{class: class, raised: c.After > c.Before, part: partOf(class, u.Target), before: u.Before, after: u.After})
				}
			}
		}
	}
	for i := range f.Changes {
		c := &f.Changes[i]
		raised := c.After > c.Before
		c.Represented = make([]bool, len(c.Products))
		parts := map[profile.Class]int{}
		part := func(class profile.Class) int {
			i, ok := parts[class]
			if !ok {
				i = partOf(class, c.Target)
				parts[class] = i
			}
			return i
		}
		for k, product := range c.Products {
			c.Represented[k] = slices.ContainsFunc(list, func(x shown) bool {
				if x.raised != raised || !product.Has(x.class) {
					return false
				}
				if x.part >= 0 {
					return x.before == c.Before && x.after == c.After && x.part == part(x.class)
				}
				return x.from < c.Target+c.Length && c.Target < x.to
			})
		}
	}
}
