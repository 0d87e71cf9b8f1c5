package diff

import (
	"cmp"
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// rowEnds gives the far ends, in the direction of travel and on the target's
// track, of the rows that differ and govern a change: for a raise, rows of the
// base; for a reduction, rows of the target. unplaced tells that there is one whose
// end the target's track does not have.
func (r *Route) rowEnds(c *Change) (ends []unit.Distance, unplaced bool) {
	if !c.RunOut {
		return nil, false
	}
	route, sources := r.Base, r.Sources[c.BeforeSources]
	if !c.Raised() {
		route, sources = r.Target, r.Sources[c.AfterSources]
	}
	for _, cause := range r.Causes[c.Causes] {
		f := &r.Files[cause.File]
		d := &f.Rows[cause.Row]
		layer, ok := layerOf(f.Path())
		if !ok {
			continue
		}
		lines := linesOf(f.Tables[d.Table].Old.Rows, d.Old)
		if !c.Raised() {
			lines = linesOf(f.Tables[d.Table].New.Rows, d.New)
		}
		for _, line := range lines {
			if !slices.ContainsFunc(sources, func(s profile.Source) bool { return s.Layer == layer && s.Pos.Line == line }) {
				continue
			}
			row := anyRow(route, layer, line)
			if row == nil {
				continue
			}
			p := row.To
			if c.Direction == codes.Reverse {
				p = row.From
			}
			end, err := r.Target.Track.Find(p)
			if err != nil {
				unplaced = true
				continue
			}
			ends = append(ends, end)
		}
	}
	return ends, unplaced
}

// heldRow is a row of the base that differs, holds until the rear of the train has
// left it, and ends somewhere on the target's track.
type heldRow struct {
	layer profile.Layer
	line  int
	end   unit.Distance
}

// holding gives the far ends of the rows of the base that differ and hold a train
// back by run-out on a raised stretch, also those that another row undercuts there:
// each of them has to be gone for the train to be as fast as it is now.
func (r *Route) holding(c *Change, train schema.Train, permanent bool) []unit.Distance {
	list := r.heldRows(c.Direction)
	// The reach of a row that ends at end lies between end and a train length
	// beyond it in the direction of travel.
	from, to := c.From-train.Length, c.To
	if c.Direction == codes.Reverse {
		from, to = c.From, c.To+train.Length
	}
	i, _ := slices.BinarySearchFunc(list, from, func(h heldRow, at unit.Distance) int { return cmp.Compare(h.end, at) })
	var ends []unit.Distance
	for _, h := range list[i:] {
		if h.end > to {
			break
		}
		if permanent && h.layer == profile.Temporary {
			continue
		}
		if _, v := rowOf(r.Base, h.layer, h.line, profile.ClassOf(train)); v != 0 && v < c.After {
			ends = append(ends, h.end)
		}
	}
	return ends
}

// heldRows lists such rows for a direction of travel, by their ends.
func (r *Route) heldRows(d codes.Direction) []heldRow {
	if r.held == nil {
		r.held = map[codes.Direction][]heldRow{}
	}
	if list, ok := r.held[d]; ok {
		return list
	}
	list := []heldRow{}
	for i := range r.Files {
		f := &r.Files[i]
		layer, ok := layerOf(f.Path())
		if !ok {
			continue
		}
		for k := range f.Rows {
			row := &f.Rows[k]
			for _, line := range linesOf(f.Tables[row.Table].Old.Rows, row.Old) {
				x := anyRow(r.Base, layer, line)
				if x == nil || !x.Delay || !x.Directions.Has(d) {
					continue
				}
				p := x.To
				if d == codes.Reverse {
					p = x.From
				}
				if end, err := r.Target.Track.Find(p); err == nil {
					list = append(list, heldRow{layer, line, end})
				}
			}
		}
	}
	slices.SortFunc(list, func(a, b heldRow) int { return cmp.Compare(a.end, b.end) })
	r.held[d] = list
	return list
}
