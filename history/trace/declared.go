package trace

import (
	"slices"

	"speedtrail/diff/align"
	"speedtrail/schema"
	"speedtrail/schema/unit"
)

// DeclaredAt tells whether a change request declares what a step of a trail changes:
// the route, the direction of travel, the train, the sense of the change and the point
// at a running distance on the newest track. Where the track itself came or went, effect
// "any" without trains declares it. The run-out of a train beyond the end of a
// declaration is not looked at.
func (v *View) DeclaredAt(q *schema.ChangeRequest, t schema.Train, at unit.Distance, s *Step) bool {
	at = min(at, v.h.Newest().Track.Length()-1)
	for _, b := range s.Before {
		side := s.After.Commit
		if s.After.Speed == 0 {
			side = b.Commit
		}
		if v.declared(q, t, at, at+1, b.Speed, s.After.Speed, side) != nil {
			return true
		}
	}
	return false
}

// DeclaredOn tells the same of a piece of today's profile and the revision that it
// dates from: whether some of what changed there is declared, and whether all of it is.
func (v *View) DeclaredOn(q *schema.ChangeRequest, t schema.Train, p *Piece) (some, all bool) {
	all = len(p.Before) > 0
	for _, b := range p.Before {
		if b.Speed == p.Speed {
			continue // nothing changed there
		}
		from, to := max(b.From, p.From), min(b.To, p.To)
		parts := v.declared(q, t, from, to, b.Speed, p.Speed, p.Origin)
		some = some || parts != nil
		all = all && len(parts) == 1 && parts[0] == align.Interval{From: from, To: to}
	}
	return some, all
}

// declared gives the parts of a stretch of the newest track on which a request declares
// a change, as the posts of a commit have it. Speed 0 is no such track.
func (v *View) declared(q *schema.ChangeRequest, t schema.Train, from, to unit.Distance, before, after unit.Speed, commit int32) (parts []align.Interval) {
	state := v.h.State[commit]
	if before == after || state < 0 {
		return nil
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
		if errFirst == nil && errLast == nil {
			parts = append(parts, sight.common(from, to, first, last)...)
		}
	}
	return align.Union(parts)
}

// common gives what a stretch of the newest track has in common with one of the
// version's own.
func (x *sight) common(from, to, first, last unit.Distance) (parts []align.Interval) {
	for _, c := range x.cells {
		there := c.Target - c.Base
		if start, end := max(from, c.Target, first+there), min(to, c.Target+c.Length, last+there); start < end {
			parts = append(parts, align.Interval{From: start, To: end})
		}
	}
	return parts
}
