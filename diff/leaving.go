package diff

import (
	"cmp"
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// Leaving is a row that differs, holds until the rear of the train has left it,
// and lies so close to the end of the route that a reference train carries it
// beyond: what it does on the neighbouring route is not looked at. So is a row
// that is the same and reaches further beyond, or less far, because the track
// between it and the end of the route differs, or the direction came or went.
type Leaving struct {
	Cause
	Direction codes.Direction
	Row       *schema.Row // of the target; of the base where the target has none that reaches beyond
	OfBase    bool
	ByTrack   bool          // the row is the same; Cause is the first difference of the track
	Longest   unit.Distance // length of the longest reference train
}

// leaving lists the rows that leave a route, in the order of its files. A route that
// only one revision has, a part of one that was split perhaps, carries nothing beyond
// its end in the other.
func (r *Route) leaving(trains []Train) []Leaving {
	longest := longestOf(trains)
	var list []Leaving
	for i := range r.Files {
		f := &r.Files[i]
		layer, ok := layerOf(f.Path())
		if !ok {
			continue
		}
		for k := range f.Rows {
			c, d := Cause{i, k}, &f.Rows[k]
			for _, direction := range codes.AllDirections {
				oldLines, newLines := linesOf(f.Tables[d.Table].Old.Rows, d.Old), linesOf(f.Tables[d.Table].New.Rows, d.New)
				now, before := beyond(r.Target, layer, newLines, direction, longest), beyond(r.Base, layer, oldLines, direction, longest)
				if len(now) == 0 && len(before) == 0 || !concernsIn(direction, func(direction codes.Direction, class profile.Class) bool {
					return !slices.Equal(carried(r.Base, layer, oldLines, direction, longest, class), carried(r.Target, layer, newLines, direction, longest, class))
				}) {
					continue
				}
				if r.carriesAlike(layer, direction, longest) {
					continue // whatever the rows are that say it
				}
				for _, row := range now {
					list = append(list, Leaving{Cause: c, Direction: direction, Row: row, Longest: longest})
				}
				if len(now) > 0 {
					continue
				}
				// A row that reached beyond and does so no more lets go of trains
				// there.
				for _, row := range before {
					list = append(list, Leaving{Cause: c, Direction: direction, Row: row, OfBase: true, Longest: longest})
				}
			}
		}
	}
	if r.Base == nil || r.Target == nil {
		return list
	}
	return append(list, r.leavingByTrack(longest)...)
}

// carriesAlike tells whether all rows of a layer together carry the same beyond the
// end of the route in both revisions, for every class of trains.
func (r *Route) carriesAlike(layer profile.Layer, direction codes.Direction, longest unit.Distance) bool {
	key := leavingKey{layer, direction}
	if alike, known := r.alike[key]; known {
		return alike
	}
	var lines [2][]int
	for side, route := range [...]*schema.Route{r.Base, r.Target} {
		lines[side] = slices.DeleteFunc(layerLines(route, layer), func(line int) bool { return len(beyond(route, layer, []int{line}, direction, longest)) == 0 })
	}
	alike := !concernsIn(direction, func(direction codes.Direction, class profile.Class) bool {
		return !slices.Equal(carried(r.Base, layer, lines[0], direction, longest, class), carried(r.Target, layer, lines[1], direction, longest, class))
	})
	if r.alike == nil {
		r.alike = map[leavingKey]bool{}
	}
	r.alike[key] = alike
	return alike
}

type leavingKey struct {
	layer     profile.Layer
	direction codes.Direction
}

// load is what a row carries beyond the end of a route: a speed, to a train length
// less the distance from the row's far end to that of the route.
type load struct {
	speed    unit.Speed
	distance unit.Distance
}

// carried lists what rows carry beyond the end of the route for a class of
// trains. A row that was cut elsewhere carries what it did.
func carried(route *schema.Route, layer profile.Layer, lines []int, d codes.Direction, length unit.Distance, class profile.Class) []load {
	var list []load
	for _, line := range lines {
		for _, row := range beyond(route, layer, []int{line}, d, length) {
			_, v := rowOf(route, layer, line, class)
			distance := route.Track.Length() - row.End
			if d == codes.Reverse {
				distance = row.Start
			}
			if v != 0 {
				list = append(list, load{v, distance})
			}
		}
	}
	slices.SortFunc(list, func(a, b load) int { return cmp.Or(cmp.Compare(a.distance, b.distance), cmp.Compare(a.speed, b.speed)) })
	return list
}

// beyond gives the rows with train length delay that a train of a length carries
// beyond the end of the route.
func beyond(route *schema.Route, layer profile.Layer, lines []int, d codes.Direction, length unit.Distance) []*schema.Row {
	var list []*schema.Row
	if route == nil {
		return nil
	}
	for _, line := range lines {
		row := anyRow(route, layer, line)
		if row == nil || !row.Delay || !row.Directions.Has(d) || !route.Directions.Has(d) {
			continue
		}
		over := row.End + length - route.Track.Length()
		if d == codes.Reverse {
			over = length - row.Start
		}
		if over > 0 {
			list = append(list, row)
		}
	}
	return list
}
