// Package fleet compares two revisions of a route for every train that the
// standard can describe, not only for the reference trains: 11 cant deficiency
// categories, 8 sets of other categories and 13 axle load categories
// (SUBSET-026 7.5.1), without a maximum speed.
//
// Reference trains are samples, and a sample can miss. Result lists each
// change with the trains that see it, as few products of category sets, and
// the stretches outside which no train of any length up to the longest sees a
// change at all. What only trains of a length between those asked for see is listed
// for such a length.
package fleet

import (
	"cmp"
	"maps"
	"slices"

	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Change is a change that some trains of a length see. Positions are running
// distances on the target's track and, in Base, on the base's.
type Change struct {
	delta.Delta
	TrainLength unit.Distance
	Products    []Product
}

// Result is the account of one route and direction of travel, with or without
// temporary restrictions.
type Result struct {
	Changes []Change // by train length as asked for, then position, then speeds
	// Between are changes that kinds of trains see on a stretch where they see none
	// at a length that was asked for: for lengths above the shortest of those and up
	// to the longest, in the same order.
	Between []Change
	LeftOut LeftOut
	// kinds are the classes that the rows tell apart, with the reach of each.
	kinds []kind
	// Reach covers every point at which a train of some length, up to the
	// longest asked for, sees a change; on the target's track, in its order.
	Reach []align.Interval
}

// Compare compiles both sides, in direction d, for every class of trains. Their rows
// and the cells may be those only that can matter for trains up to the longest. The
// lengths, one at least, are those for which changes are listed.
func Compare(base, target *profile.Compiler, d codes.Direction, cells []align.Cell, lengths []unit.Distance) Result {
	p := pair{base: base, target: target, cells: cells, direction: d, lengths: lengths}
	var r Result
	if len(cells) == 0 {
		return r
	}
	p.distinguish()
	for _, length := range lengths {
		r.Changes = append(r.Changes, p.changes(length, nil)...)
	}
	r.Reach = p.reach(slices.Max(lengths))
	r.kinds = p.kinds
	chosen, leftOut := chooseLengths(p.between)
	for _, length := range slices.Sorted(maps.Keys(chosen)) {
		r.Between = append(r.Between, p.changes(length, chosen[length])...)
	}
	r.LeftOut = leftOut
	return r
}

// pair is both sides of a route, and the classes of trains that their rows
// cannot tell apart.
type pair struct {
	base, target *profile.Compiler
	cells        []align.Cell
	direction    codes.Direction
	kinds        []kind
	memory       [2]step.Func // for profiles, used again
	lengths      []unit.Distance
	between      []sight // what only trains of a length between see
}

// kind is a set of classes that every row of both sides treats alike.
type kind struct {
	before, after profile.Selection
	set           classSet
	reach         []align.Interval
}

// ReachOf is Reach for the trains of a class alone.
func (r *Result) ReachOf(c profile.Class) []align.Interval {
	for i := range r.kinds {
		if k := &r.kinds[i]; k.set[c.Cant][c.Categories]&(1<<c.AxleLoad) != 0 {
			return k.reach
		}
	}
	return nil
}

// distinguish sorts the classes into kinds. What a row gives depends on the
// cant deficiency and other categories alone, or on the axle load alone; so
// the kinds are those of the one times those of the other.
func (p *pair) distinguish() {
	type group struct {
		class profile.Class
		list  []profile.Class
	}
	sort := func(classes []profile.Class) []group {
		var groups []group
		seen := map[string]int{}
		var key []byte
		for _, c := range classes {
			key = key[:0]
			for _, v := range append(p.base.Select(c), p.target.Select(c)...) {
				key = append(key, byte(v/unit.SpeedStep))
			}
			i, ok := seen[string(key)]
			if !ok {
				i = len(groups)
				seen[string(key)] = i
				groups = append(groups, group{class: c})
			}
			groups[i].list = append(groups[i].list, c)
		}
		return groups
	}
	static, axle := classes()
	axles := sort(axle)
	for _, s := range sort(static) {
		for _, a := range axles {
			class := s.class
			class.AxleLoad = a.class.AxleLoad
			k := kind{before: p.base.Select(class), after: p.target.Select(class)}
			mask := uint16(0)
			for _, c := range a.list {
				mask |= 1 << c.AxleLoad
			}
			for _, c := range s.list {
				k.set[c.Cant][c.Categories] = mask
			}
			p.kinds = append(p.kinds, k)
		}
	}
}

// changes lists the changes that trains of a length see; with only, those of some
// kinds that lie on some stretches, which stand in order and do not touch.
func (p *pair) changes(length unit.Distance, only map[int][]align.Interval) []Change {
	sets := map[delta.Delta]*classSet{}
	var order []delta.Delta
	sweep := func(k *kind, length unit.Distance) (b, t step.Func) {
		m := &p.memory
		m[0] = p.base.AppendSweep(m[0][:0], k.before, length, profile.NoMaximum)
		m[1] = p.target.AppendSweep(m[1][:0], k.after, length, profile.NoMaximum)
		return m[0], m[1]
	}
	for i := range p.kinds {
		stretches, wanted := only[i]
		if only != nil && !wanted {
			continue
		}
		k := &p.kinds[i]
		b, t := sweep(k, length)
		found := delta.Between(b, t, p.cells)
		if only != nil {
			found = slices.DeleteFunc(found, func(d delta.Delta) bool {
				return !align.Touches(stretches, d.Target, d.Target+d.Length)
			})
		}
		if len(found) == 0 {
			continue
		}
		b, t = sweep(k, 0)
		found = delta.MarkRunOut(found, b, t)
		for _, d := range found {
			set := sets[d]
			if set == nil {
				set = new(classSet)
				sets[d] = set
				order = append(order, d)
			}
			set.join(&k.set)
		}
	}
	slices.SortFunc(order, func(a, b delta.Delta) int {
		return cmp.Or(cmp.Compare(a.Target, b.Target), cmp.Compare(a.Length, b.Length),
			cmp.Compare(a.Before, b.Before), cmp.Compare(a.After, b.After), compareBool(a.RunOut, b.RunOut))
	})
	list := make([]Change, len(order))
	for i, d := range order {
		list[i] = Change{Delta: d, TrainLength: length, Products: products(sets[d])}
	}
	return list
}

func compareBool(a, b bool) int {
	switch {
	case a == b:
		return 0
	case b:
		return -1
	}
	return 1
}

func (s *classSet) join(t *classSet) {
	for c := range s {
		for k := range s[c] {
			s[c][k] |= t[c][k]
		}
	}
}
