package diff

import (
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// leavingByTrack lists the rows that are the same in both revisions and carry
// something else beyond the end of the route, because the end has moved, a jump before
// it differs, or only one revision has the direction.
func (r *Route) leavingByTrack(longest unit.Distance) []Leaving {
	if len(r.causes.track) == 0 {
		return nil
	}
	var list []Leaving
	for _, layer := range [...]profile.Layer{profile.StaticSpeed, profile.AxleLoad, profile.Temporary} {
		for _, direction := range codes.AllDirections {
			if r.carriesAlike(layer, direction, longest) {
				continue
			}
			var same [2][]int // lines of the rows that do not differ
			var leave [2][]*schema.Row
			for side, route := range [...]*schema.Route{r.Base, r.Target} {
				same[side] = slices.DeleteFunc(layerLines(route, layer), func(line int) bool { return r.causes.byLine[rowPlace{side, line, layer}] != nil })
				leave[side] = beyond(route, layer, same[side], direction, longest)
			}
			if !concernsIn(direction, func(direction codes.Direction, class profile.Class) bool {
				return !slices.Equal(carried(r.Base, layer, same[0], direction, longest, class), carried(r.Target, layer, same[1], direction, longest, class))
			}) {
				continue
			}
			side := 1
			if len(leave[side]) == 0 {
				side = 0
			}
			for _, row := range leave[side] {
				list = append(list, Leaving{Cause: r.causes.track[0], Direction: direction, Row: row, OfBase: side == 0, ByTrack: true, Longest: longest})
			}
		}
	}
	return list
}

// layerLines gives the lines of the rows of a layer, in their order.
func layerLines(route *schema.Route, layer profile.Layer) []int {
	var lines []int
	if route == nil {
		return nil
	}
	switch layer {
	case profile.StaticSpeed:
		for i := range route.Speed {
			lines = append(lines, route.Speed[i].Pos.Line)
		}
	case profile.AxleLoad:
		for i := range route.AxleLoad {
			lines = append(lines, route.AxleLoad[i].Pos.Line)
		}
	case profile.Temporary:
		for i := range route.Temporary {
			lines = append(lines, route.Temporary[i].Pos.Line)
		}
	}
	return lines
}
