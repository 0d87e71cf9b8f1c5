package diff

import (
	"cmp"
	"encoding/binary"
	"slices"
	"strconv"

	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/profile"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// compareRoute fills in what differs on one route.
func compareRoute(r *Route, trains []Train) {
	switch {
	case r.Base == nil:
		r.wholeTrack(Added)
		return
	case r.Target == nil:
		r.wholeTrack(Removed)
		return
	}
	tracks := align.Tracks(r.Base.Track, r.Target.Track)
	r.sources = sourceTable{route: r, seen: map[string]int{}}
	for _, d := range codes.AllDirections {
		inBase, inTarget := r.Base.Directions.Has(d), r.Target.Directions.Has(d)
		switch {
		case inBase && inTarget:
			for _, i := range tracks.Removed {
				r.Track = append(r.Track, TrackChange{d, Removed, i.From, i.To})
			}
			for _, i := range tracks.Added {
				r.Track = append(r.Track, TrackChange{d, Added, i.From, i.To})
			}
			compareDirection(r, d, tracks.Common, trains)
		case inBase:
			r.Track = append(r.Track, TrackChange{d, Removed, 0, r.Base.Track.Length()})
		case inTarget:
			r.Track = append(r.Track, TrackChange{d, Added, 0, r.Target.Track.Length()})
		}
	}
	// Trains are sorted by id, so that their index is their order.
	slices.SortFunc(r.Changes, func(a, b Change) int {
		return cmp.Or(cmp.Compare(a.Direction, b.Direction), cmp.Compare(a.From, b.From), cmp.Compare(a.Train, b.Train))
	})
}

// wholeTrack states a route that only one revision has.
func (r *Route) wholeTrack(f Fate) {
	route := r.Target
	if f == Removed {
		route = r.Base
	}
	for _, d := range codes.AllDirections {
		if route.Directions.Has(d) {
			r.Track = append(r.Track, TrackChange{d, f, 0, route.Track.Length()})
		}
	}
}

// compareDirection compiles both sides for every train and appends the changes.
func compareDirection(r *Route, d codes.Direction, cells []align.Cell, trains []Train) {
	base := profile.New(r.Base, d, profile.All)
	target := profile.New(r.Target, d, profile.All)
	delayed := base.Delayed() || target.Delayed()
	known := make(map[string][]delta.Delta)
	var key []byte
	for i, t := range trains {
		class := profile.ClassOf(t.Train)
		before, after := base.Select(class), target.Select(class)
		length := t.Length
		if !delayed {
			length = 0
		}
		// Trains that no row tells apart are compared once.
		key = appendKey(key[:0], before, after, length, t.Max)
		changes, ok := known[string(key)]
		if !ok {
			changes = compareTrain(base, target, before, after, t.Length, t.Max, cells)
			known[string(key)] = changes
		}
		for _, c := range changes {
			r.Changes = append(r.Changes, Change{
				Direction: d, From: c.Target, To: c.Target + c.Length, Train: i,
				Before: c.Before, After: c.After, RunOut: c.RunOut,
				BeforeSources: r.sources.index(base, before, t, c.Base, c.Length, c.Before),
				AfterSources:  r.sources.index(target, after, t, c.Target, c.Length, c.After),
			})
		}
	}
}

// appendKey writes what a profile depends on.
func appendKey(key []byte, before, after profile.Selection, length unit.Distance, maximum unit.Speed) []byte {
	for _, sel := range [...]profile.Selection{before, after} {
		for _, v := range sel {
			key = append(key, byte(v/unit.SpeedStep))
		}
	}
	key = binary.AppendVarint(key, int64(length))
	return binary.AppendVarint(key, int64(maximum))
}

// sourceTable keeps each distinct list of governing rows of a route once.
type sourceTable struct {
	route *Route
	seen  map[string]int
	key   []byte
}

// index gives the place in Route.Sources of the rows that give the speed v to
// the train on a stretch of the compiler's side.
func (s *sourceTable) index(c *profile.Compiler, sel profile.Selection, t Train, from, length unit.Distance, v unit.Speed) int {
	rows := c.Governing(sel, t.Length, t.Max, from, from+length, v)
	key := s.key[:0]
	for _, row := range rows {
		key = c.AppendSourceKey(key, row, t.Train)
	}
	s.key = key
	if i, ok := s.seen[string(key)]; ok {
		return i
	}
	list := make([]profile.Source, len(rows))
	for i, row := range rows {
		list[i] = c.Source(row, t.Train)
	}
	i := len(s.route.Sources)
	s.seen[string(key)] = i
	s.route.Sources = append(s.route.Sources, list)
	return i
}

// SourceText joins sources in the form that they have in results.
func SourceText(sources []profile.Source) string {
	var b []byte
	for i, s := range sources {
		if i > 0 {
			b = append(b, "; "...)
		}
		b = append(b, s.Pos.File...)
		b = append(b, ':')
		b = strconv.AppendInt(b, int64(s.Pos.Line), 10)
		b = append(b, ' ')
		b = append(b, s.Kind...)
		b = append(b, ' ')
		b = strconv.AppendInt(b, int64(s.Value), 10)
	}
	return string(b)
}
