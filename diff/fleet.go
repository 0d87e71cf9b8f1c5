package diff

import (
	"cmp"
	"slices"
	"sort"

	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/fleet"
	"speedtrail/diff/profile"
	"speedtrail/schema"
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
	// Causes are, for a product that no reference train represents, the differences
	// behind the change, as the product's example of the first length feels them.
	Causes [][]Cause
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
		found := fleet.Compare(s.base, s.target, p.direction, s.cells, asked)
		f := Fleet{Direction: p.direction, Permanent: permanent, Shortest: shortest, Longest: longest, Reach: found.Reach, Changes: joinLengths(append(found.Changes, found.Between...)), LeftOut: found.LeftOut}
		if permanent {
			f.Changes = without(f.Changes, list[0].Changes)
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

// without takes the changes out of a list that another holds as well.
func without(list, out []FleetChange) []FleetChange {
	at := make(map[delta.Delta][]int, len(out))
	for i, c := range out {
		at[c.Delta] = append(at[c.Delta], i)
	}
	return slices.DeleteFunc(list, func(c FleetChange) bool {
		return slices.ContainsFunc(at[c.Delta], func(i int) bool {
			return slices.Equal(c.Lengths, out[i].Lengths) && slices.Equal(c.Products, out[i].Products)
		})
	})
}

// joinLengths joins changes that trains of several lengths see alike.
func joinLengths(changes []fleet.Change) []FleetChange {
	var list []FleetChange
	at := make(map[delta.Delta][]int, len(changes)) // indices in list
	for _, c := range changes {
		same := at[c.Delta]
		k := slices.IndexFunc(same, func(i int) bool { return slices.Equal(list[i].Products, c.Products) })
		if k < 0 {
			at[c.Delta] = append(same, len(list))
			list = append(list, FleetChange{Delta: c.Delta, Lengths: []unit.Distance{c.TrainLength}, Products: c.Products})
			continue
		}
		list[same[k]].Lengths = append(list[same[k]].Lengths, c.TrainLength)
	}
	slices.SortStableFunc(list, func(a, b FleetChange) int {
		return cmp.Or(cmp.Compare(a.Target, b.Target), cmp.Compare(a.Length, b.Length), cmp.Compare(a.Before, b.Before), cmp.Compare(a.After, b.After))
	})
	return list
}

// shown is what the reference trains of a class show.
type shown struct {
	// raised and lowered are the stretches on which one of them sees a change of
	// that sense.
	raised, lowered []align.Interval
	// free are the changes that they see without their maximum speed in the same
	// place and sense.
	free map[freeChange]bool
	// reach is where trains of the class, of some length, see a change.
	reach []align.Interval
}

// freeChange is a change without a maximum speed, with the number of the stretch
// of the reach that it lies on.
type freeChange struct {
	part          int
	before, after unit.Speed
}

// of gives the stretches of a sense.
func (s *shown) of(raised bool) *[]align.Interval {
	if raised {
		return &s.raised
	}
	return &s.lowered
}

// represent finds the products of which a reference train sees the change: it
// changes in the same sense on a part of the same place; or it sees, as far as
// its maximum speed lets it, the same speeds change elsewhere on the same stretch
// that trains of its kind see without a gap, where its length carries the change.
func (p *pair) represent(f *Fleet, found *fleet.Result, s sides, trains []Train) {
	byClass := p.show(f.Permanent, found, s, trains)
	for i := range f.Changes {
		c := &f.Changes[i]
		end := c.Target + c.Length
		c.Represented = make([]bool, len(c.Products))
		for class, x := range byClass {
			seen := align.Touches(*x.of(c.After > c.Before), c.Target, end) ||
				x.free[freeChange{partOf(x.reach, c.Target), c.Before, c.After}]
			for k, product := range c.Products {
				c.Represented[k] = c.Represented[k] || seen && product.Has(class)
			}
		}
		c.Causes = make([][]Cause, len(c.Products))
		for k, product := range c.Products {
			if !c.Represented[k] {
				c.Causes[k] = p.causes(s, c.Delta, product.Example(), c.Lengths[0])
			}
		}
	}
}

// causes lists the differences behind a change that a train of a class and length
// without a maximum speed sees.
func (p *pair) causes(s sides, d delta.Delta, class profile.Class, length unit.Distance) []Cause {
	train := schema.Train{Cant: class.Cant, Categories: class.Categories, AxleLoad: class.AxleLoad, Length: length, Max: profile.NoMaximum}
	var governing [2][]profile.Source
	for side, x := range [...]struct {
		compiler *profile.Compiler
		from     unit.Distance
		speed    unit.Speed
	}{{s.base, d.Base, d.Before}, {s.target, d.Target, d.After}} {
		for _, row := range x.compiler.Governing(x.compiler.Select(class), length, profile.NoMaximum, x.from, x.from+d.Length, x.speed) {
			governing[side] = append(governing[side], x.compiler.Source(row, train))
		}
	}
	c := Change{Direction: p.direction, From: d.Target, To: d.Target + d.Length}
	near := d.RunOut && p.route.causes.jointBehind(&c, length)
	return p.route.causes.behind(governing, p.direction, class, near)
}

// show gives what the reference trains show, by their class.
func (p *pair) show(permanent bool, found *fleet.Result, s sides, trains []Train) map[profile.Class]*shown {
	byClass := map[profile.Class]*shown{}
	for i, t := range trains {
		class := profile.ClassOf(t.Train)
		seen := p.sights[i].changes
		if permanent {
			// Not what it sees today: a change that a temporary restriction makes
			// stands for no permanent one.
			seen = s.compare(s.base.Select(class), s.target.Select(class), t.Length, t.Max)
		}
		if len(seen) == 0 {
			continue
		}
		x := byClass[class]
		if x == nil {
			x = &shown{free: map[freeChange]bool{}, reach: found.ReachOf(class)}
			byClass[class] = x
		}
		// Both lists are in the order of the target's track, without overlap.
		free := s.compare(s.base.Select(class), s.target.Select(class), t.Length, profile.NoMaximum)
		for _, c := range seen {
			raised, end := c.After > c.Before, c.Target+c.Length
			list := x.of(raised)
			*list = append(*list, align.Interval{From: c.Target, To: end})
			for len(free) > 0 && free[0].Target+free[0].Length <= c.Target {
				free = free[1:]
			}
			for _, u := range free {
				if u.Target >= end {
					break
				}
				if part := partOf(x.reach, u.Target); part >= 0 && (u.After > u.Before) == raised {
					x.free[freeChange{part, u.Before, u.After}] = true
				}
			}
		}
	}
	for _, x := range byClass {
		x.raised, x.lowered = align.Union(x.raised), align.Union(x.lowered)
	}
	return byClass
}

// partOf gives the number of the stretch of a reach that a place lies on; -1 where
// it lies on none.
func partOf(reach []align.Interval, at unit.Distance) int {
	i := sort.Search(len(reach), func(i int) bool { return reach[i].To > at })
	if i == len(reach) || at < reach[i].From {
		return -1
	}
	return i
}
