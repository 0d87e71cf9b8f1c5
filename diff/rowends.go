package diff

import (
	"cmp"
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// rowEnds gives the far ends, in the direction of travel, of the rows that differ
// and govern a change: for a raise, rows of the base on the base's track; for a
// reduction, rows of the target on the target's.
func (r *Route) rowEnds(c *Change) (ends []unit.Distance) {
	if !c.RunOut {
		return nil
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
			if row := anyRow(route, layer, line); row != nil {
				ends = append(ends, farEnd(row, c.Direction))
			}
		}
	}
	return ends
}

// farEnd is where the front of a train leaves a row.
func farEnd(row *schema.Row, d codes.Direction) unit.Distance {
	if d == codes.Reverse {
		return row.Start
	}
	return row.End
}

// heldRow is a row of the base that holds until the rear of the train has left it.
type heldRow struct {
	layer profile.Layer
	line  int
	end   unit.Distance // on the base's track
	again []int         // lines of rows of the target that hold to the same end; where the track differs
}

// holding gives the far ends, on the base's track, of the rows of the base that hold
// a train back by run-out on a raised stretch, also those that another row undercuts
// there: each of them has to be gone for the train to be as fast as it is now. Those
// that the target holds to the same end let go because the track differs. ahead is by
// how much the stretch lies further on on the target's track.
func (r *Route) holding(c *Change, ahead unit.Distance, train schema.Train, permanent bool) (gone, same []unit.Distance) {
	list := r.heldRows(c.Direction)
	// The reach of a row that ends at end lies between end and a train length
	// beyond it in the direction of travel.
	from, to := c.From-ahead-train.Length, c.To-ahead
	if c.Direction == codes.Reverse {
		from, to = c.From-ahead, c.To-ahead+train.Length
	}
	class := profile.ClassOf(train)
	i, _ := slices.BinarySearchFunc(list, from, func(h heldRow, at unit.Distance) int { return cmp.Compare(h.end, at) })
	for _, h := range list[i:] {
		if h.end > to {
			break
		}
		if permanent && h.layer == profile.Temporary {
			continue
		}
		_, v := rowOf(r.Base, h.layer, h.line, class)
		if v == 0 || v >= c.After {
			continue
		}
		if slices.ContainsFunc(h.again, func(line int) bool { _, w := rowOf(r.Target, h.layer, line, class); return w == v }) {
			same = append(same, h.end)
		} else {
			gone = append(gone, h.end)
		}
	}
	return gone, same
}

// heldRows lists the rows that may hold a train back in a direction of travel where
// it is faster now, by their ends: those that differ, and every row where the track
// differs.
func (r *Route) heldRows(d codes.Direction) []heldRow {
	if r.held == nil {
		r.held = map[codes.Direction][]heldRow{}
	}
	if list, ok := r.held[d]; ok {
		return list
	}
	list := []heldRow{}
	if slices.Equal(r.Base.Track.Segments(), r.Target.Track.Segments()) {
		for i := range r.Files {
			f := &r.Files[i]
			layer, ok := layerOf(f.Path())
			if !ok {
				continue
			}
			for k := range f.Rows {
				row := &f.Rows[k]
				for _, line := range linesOf(f.Tables[row.Table].Old.Rows, row.Old) {
					if x := anyRow(r.Base, layer, line); x != nil && x.Delay && x.Directions.Has(d) {
						list = append(list, heldRow{layer: layer, line: line, end: farEnd(x, d)})
					}
				}
			}
		}
	} else {
		for _, layer := range [...]profile.Layer{profile.StaticSpeed, profile.AxleLoad, profile.Temporary} {
			again := map[chainage.Point][]int{}
			for _, line := range layerLines(r.Target, layer) {
				if x := anyRow(r.Target, layer, line); x.Delay && x.Directions.Has(d) {
					again[endPoint(r.Target, x, d)] = append(again[endPoint(r.Target, x, d)], line)
				}
			}
			for _, line := range layerLines(r.Base, layer) {
				if x := anyRow(r.Base, layer, line); x.Delay && x.Directions.Has(d) {
					list = append(list, heldRow{layer, line, farEnd(x, d), again[endPoint(r.Base, x, d)]})
				}
			}
		}
	}
	slices.SortFunc(list, func(a, b heldRow) int { return cmp.Compare(a.end, b.end) })
	r.held[d] = list
	return list
}

// endPoint is the far end of a row by the posts, as both revisions would write it.
func endPoint(route *schema.Route, row *schema.Row, d codes.Direction) chainage.Point {
	if d == codes.Reverse {
		return route.Track.Begins(row.Start).Plain()
	}
	return route.Track.Ends(row.End).Plain()
}
