package scope

import (
	"cmp"
	"slices"

	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

type interval struct{ from, to unit.Distance }

// reach gives where the rear of the train carries a row beyond its far end.
func (o *Observed) reach(end unit.Distance) interval {
	if o.Direction == codes.Reverse {
		return interval{end - o.TrainLength, end}
	}
	return interval{end, end + o.TrainLength}
}

// Prepare looks at where rows hold a raise back by run-out that no declaration lets
// go: a train is faster at a point only when all rows that held it back there are
// gone, and so all of them have to be declared. It is slower as soon as one comes.
func (o *Observed) Prepare(declared []Declared) {
	o.undeclared = nil
	if !o.RunOut || !o.Raised {
		return
	}
	if o.Unplaced {
		o.undeclared = []interval{{o.From, o.To}}
		return
	}
	for _, end := range o.RowEnds {
		if !slices.ContainsFunc(declared, func(d Declared) bool { return d.allows(o) && d.ends(o, end) }) {
			o.undeclared = append(o.undeclared, o.reach(end))
		}
	}
	o.undeclared = union(o.undeclared)
}

// ends tells whether a row that ends somewhere lies in the declaration: one that
// ends where the declaration begins does not.
func (d *Declared) ends(o *Observed, end unit.Distance) bool {
	if o.Direction == codes.Reverse {
		return d.From <= end && end < d.To
	}
	return d.From < end && end <= d.To
}

// runOut gives the stretches past the far end in which run-out is inside: as far as
// the train carries a row that ends in the declaration, and no row holds it back
// that ends elsewhere.
func (d *Declared) runOut(o *Observed) []interval {
	if !o.RunOut {
		return nil
	}
	var list []interval
	for _, end := range o.RowEnds {
		if !d.ends(o, end) {
			continue
		}
		x := o.reach(end)
		if o.Direction == codes.Reverse {
			x.to = min(x.to, d.From)
		} else {
			x.from = max(x.from, d.To)
		}
		list = append(list, x)
	}
	return without(union(list), o.undeclared)
}

// union joins intervals that overlap or touch, and sorts them.
func union(list []interval) []interval {
	list = slices.DeleteFunc(list, func(x interval) bool { return x.from >= x.to })
	slices.SortFunc(list, func(a, b interval) int { return cmp.Compare(a.from, b.from) })
	joined := list[:0]
	for _, x := range list {
		if n := len(joined); n > 0 && x.from <= joined[n-1].to {
			joined[n-1].to = max(joined[n-1].to, x.to)
			continue
		}
		joined = append(joined, x)
	}
	return joined
}

// without takes the parts out of a union that lie in another.
func without(list, out []interval) []interval {
	if len(out) == 0 {
		return list
	}
	var left []interval
	for _, x := range list {
		for _, o := range out {
			if o.to <= x.from || x.to <= o.from {
				continue
			}
			if x.from < o.from {
				left = append(left, interval{x.from, o.from})
			}
			x.from = min(x.to, o.to)
		}
		if x.from < x.to {
			left = append(left, x)
		}
	}
	return left
}
