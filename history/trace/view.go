package trace

import (
	"slices"

	"speedtrail/diff/align"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// View is a history seen in one direction of travel. It keeps what was compiled,
// so that many trains and points cost little more than one. It is not safe for
// concurrent use.
type View struct {
	h         *History
	line      *line
	direction codes.Direction
	versions  []sight
}

// sight is what the view knows of a version.
type sight struct {
	compiler *profile.Compiler // nil before it is needed, and where there is no such direction
	cells    []align.Cell      // what its track has in common with the newest one's
	ready    bool
}

// View looks at the history in a direction. The newest revision must have the
// route.
func (h *History) View(d codes.Direction, firstParent bool) *View {
	return &View{h: h, line: newLine(h, firstParent), direction: d, versions: make([]sight, len(h.Versions))}
}

// With gives the same view in another direction.
func (v *View) With(d codes.Direction) *View {
	return &View{h: v.h, line: v.line, direction: d, versions: make([]sight, len(v.versions))}
}

func (v *View) version(s int32) *sight {
	x := &v.versions[s]
	if x.ready {
		return x
	}
	x.ready = true
	route := v.h.Versions[s].Route
	if route.Directions.Has(v.direction) {
		x.compiler = profile.New(route, v.direction, profile.All)
		x.cells = align.Tracks(route.Track, v.h.Newest().Track).Common
	}
	return x
}

// place matches a running distance on the newest track; false where a version
// has no such track.
func (x *sight) place(at unit.Distance) (unit.Distance, bool) {
	for _, c := range x.cells {
		if c.Target <= at && at < c.Target+c.Length {
			return c.Base + at - c.Target, true
		}
	}
	return 0, false
}

// profileOn gives the profile of a train laid on the newest track, for the
// window from <= s < to; speed 0 where there is no such track.
func (x *sight) profileOn(t schema.Train, from, to unit.Distance) step.Func {
	var f step.Func
	at := from
	if x.compiler != nil {
		own := x.compiler.Compile(t)
		for _, c := range x.cells {
			start, end := max(from, c.Target), min(to, c.Target+c.Length)
			if start >= end {
				continue
			}
			f = f.Append(step.Piece{From: at, To: start})
			for cur := own.CursorAt(c.Base + start - c.Target); start < end; {
				cur.Advance(c.Base + start - c.Target)
				p := cur.Piece()
				next := min(end, p.To-c.Base+c.Target)
				f = f.Append(step.Piece{From: start, To: next, Speed: p.Speed})
				start = next
			}
			at = end
		}
	}
	return f.Append(step.Piece{From: at, To: to})
}

// governing lists the rows that give a train its speed in a version on a stretch
// of the newest track, in the order of the version's track.
func (x *sight) governing(t schema.Train, from, to unit.Distance, speed unit.Speed) []profile.Source {
	if x.compiler == nil || speed == 0 {
		return nil
	}
	sel := x.compiler.Select(profile.ClassOf(t))
	var rows []int32
	for _, c := range x.cells {
		start, end := max(from, c.Target), min(to, c.Target+c.Length)
		if start >= end {
			continue
		}
		own := c.Base - c.Target
		for _, row := range x.compiler.Governing(sel, t.Length, t.Max, own+start, own+end, speed) {
			if !slices.Contains(rows, row) {
				rows = append(rows, row)
			}
		}
	}
	list := make([]profile.Source, len(rows))
	for i, row := range rows {
		list[i] = x.compiler.Source(row, t)
	}
	return list
}
