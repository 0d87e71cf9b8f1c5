package scope

import (
	"slices"

	"speedtrail/diff/align"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// reach gives where the rear of the train carries a row beyond its far end, on the
// target's track: as far as on that of the row.
func (o *Observed) reach(end unit.Distance) align.Interval {
	end += o.ahead()
	if o.Direction == codes.Reverse {
		return align.Interval{From: end - o.TrainLength, To: end}
	}
	return align.Interval{From: end, To: end + o.TrainLength}
}

// prepare looks at where rows hold a raise back by run-out that no declaration lets
// go: a train is faster at a point only when all rows that held it back there are
// gone, and so all of them have to be declared. It is slower as soon as one comes.
func (o *Observed) prepare(declared []Declared) {
	o.undeclared = nil
	if !o.RunOut || !o.Raised {
		return
	}
	for _, end := range o.RowEnds {
		if !slices.ContainsFunc(declared, func(d Declared) bool { return d.allows(o) && d.ends(o, end) }) {
			o.undeclared = append(o.undeclared, o.reach(end))
		}
	}
	for _, end := range o.Same {
		o.undeclared = append(o.undeclared, o.reach(end))
	}
	o.undeclared = union(o.undeclared)
}

// ahead is how much further on the change lies than on the track of its rows.
func (o *Observed) ahead() unit.Distance {
	if o.Raised {
		return o.Ahead
	}
	return 0
}

// byRows gives the stretch of a declaration on the track of the rows of a change.
func (d *Declared) byRows(o *Observed) align.Interval {
	if o.Raised && d.Base != nil {
		return *d.Base
	}
	return align.Interval{From: d.From, To: d.To}
}

// ends tells whether a row that ends somewhere lies in the declaration: one that
// ends where the declaration begins does not.
func (d *Declared) ends(o *Observed, end unit.Distance) bool {
	on := d.byRows(o)
	if o.Direction == codes.Reverse {
		return on.From <= end && end < on.To
	}
	return on.From < end && end <= on.To
}

// runOut gives the stretches past the far end in which run-out is inside: as far as
// the train carries a row that ends in the declaration, and no row holds it back
// that ends elsewhere.
func (d *Declared) runOut(o *Observed) []align.Interval {
	if !o.RunOut {
		return nil
	}
	var list []align.Interval
	for _, end := range o.RowEnds {
		if !d.ends(o, end) {
			continue
		}
		x, on := o.reach(end), d.byRows(o)
		if o.Direction == codes.Reverse {
			x.To = min(x.To, on.From+o.ahead())
		} else {
			x.From = max(x.From, on.To+o.ahead())
		}
		list = append(list, x)
	}
	return without(union(list), o.undeclared)
}

// union joins the intervals that are not empty.
func union(list []align.Interval) []align.Interval {
	return align.Union(slices.DeleteFunc(list, func(x align.Interval) bool { return x.From >= x.To }))
}

// without takes the parts out of a union that lie in another.
func without(list, out []align.Interval) []align.Interval {
	if len(out) == 0 {
		return list
	}
	var left []align.Interval
	for _, x := range list {
		for _, o := range out {
			if o.To <= x.From || x.To <= o.From {
				continue
			}
			if x.From < o.From {
				left = append(left, align.Interval{From: x.From, To: o.From})
			}
			x.From = min(x.To, o.To)
		}
		if x.From < x.To {
			left = append(left, x)
		}
	}
	return left
}
