package diff

import (
	"speedtrail/diff/rows"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Leaving is a row that differs, holds until the rear of the train has left it,
// and lies so close to the end of the route that a reference train carries it
// beyond: what it does on the neighbouring route is not looked at.
type Leaving struct {
	Cause
	Direction codes.Direction
	Row       *schema.Row // of the target; of the base for a removed row
	Removed   bool
	Longest   unit.Distance // length of the longest reference train
}

// leaving lists the rows that leave a route which both revisions have, in the
// order of its files.
func (r *Route) leaving(trains []Train) []Leaving {
	longest := unit.Distance(0)
	for _, t := range trains {
		longest = max(longest, t.Length)
	}
	var list []Leaving
	for i := range r.Files {
		f := &r.Files[i]
		layer, ok := layerOf(f.Path())
		if !ok {
			continue
		}
		for k := range f.Rows {
			c, d := Cause{i, k}, &f.Rows[k]
			route, lines := r.Target, linesOf(f.Tables[d.Table].New.Rows, d.New)
			if d.Kind == rows.Removed {
				route, lines = r.Base, linesOf(f.Tables[d.Table].Old.Rows, d.Old)
			}
			for _, direction := range codes.AllDirections {
				if !route.Directions.Has(direction) || !r.concerns(c, direction) {
					continue
				}
				for _, line := range lines {
					row := anyRow(route, layer, line)
					if row == nil || !row.Delay || !row.Directions.Has(direction) {
						continue
					}
					beyond := row.End + longest - route.Track.Length()
					if direction == codes.Reverse {
						beyond = longest - row.Start
					}
					if beyond > 0 {
						list = append(list, Leaving{c, direction, row, d.Kind == rows.Removed, longest})
					}
				}
			}
		}
	}
	return list
}
