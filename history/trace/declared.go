package trace

import (
	"slices"

	"speedtrail/diff/align"
	"speedtrail/schema"
	"speedtrail/schema/unit"
)

// DeclaredAt tells whether a change request declares what a step of a trail changes:
// the route, the direction of travel, the train, the sense of the change and the point
// at a running distance on the newest track. Where the track itself came or went, effect "any" without trains
// declares it. The run-out of a train beyond the end of a declaration is not looked at.
func (v *View) DeclaredAt(q *schema.ChangeRequest, t schema.Train, at unit.Distance, s *Step) bool {
	at = min(at, v.h.Newest().Track.Length()-1)
	for _, b := range s.Before {
		side := s.After.Commit
		if s.After.Speed == 0 {
			side = b.Commit
		}
		if v.declared(q, t, at, at+1, b.Speed, s.After.Speed, side) {
			return true
		}
	}
	return false
}

// DeclaredOn tells the same of a piece of today's profile and the revision that it
// dates from: whether some of what changed there is declared.
func (v *View) DeclaredOn(q *schema.ChangeRequest, t schema.Train, p *Piece) bool {
	for _, b := range p.Before {
		if v.declared(q, t, max(b.From, p.From), min(b.To, p.To), b.Speed, p.Speed, p.Origin) {
			return true
		}
	}
	return false
}

// declared tells whether a request declares some of a change on a stretch of the newest
// track, as the posts of a commit have it. Speed 0 is no such track.
func (v *View) declared(q *schema.ChangeRequest, t schema.Train, from, to unit.Distance, before, after unit.Speed, commit int32) bool {
	state := v.h.State[commit]
	if before == after || state < 0 {
		return false
	}
	route, sight := v.h.Versions[state].Route, v.version(state)
	for i := range q.Declare {
		d := &q.Declare[i]
		switch {
		case d.Route != route.ID, !d.Span.Directions.Has(v.direction),
			d.Effect == schema.Raise && after < before, d.Effect == schema.Lower && after > before,
			d.Effect != schema.AnyEffect && (before == 0 || after == 0),
			len(d.Trains) > 0 && (before == 0 || after == 0 || !slices.Contains(d.Trains, t.ID)):
			continue
		}
		first, errFirst := route.Track.Find(d.Span.From)
		last, errLast := route.Track.Find(d.Span.To)
		if errFirst == nil && errLast == nil && sight.overlaps(from, to, first, last) {
			return true
		}
	}
	return false
}

// overlaps tells whether a stretch of the newest track has something in common with one
// of the version's own.
func (x *sight) overlaps(from, to, first, last unit.Distance) bool {
	return slices.ContainsFunc(x.cells, func(c align.Cell) bool {
		start, end := max(from, c.Target), min(to, c.Target+c.Length)
		own := c.Base - c.Target
		return start < end && max(first, own+start) < min(last, own+end)
	})
}
