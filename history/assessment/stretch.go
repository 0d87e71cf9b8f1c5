package assessment

import (
	"cmp"
	"slices"

	"speedtrail/diff"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// stretches writes the pictures of an account. groups maps the changes of each
// route to those of the document.
func stretches(a *diff.Account, groups [][]int) Stretches {
	out := Stretches{LeftOut: a.StretchesLeftOut, List: []Stretch{}}
	for _, s := range a.Stretches {
		target := a.Routes[s.Route].Target
		doc := Stretch{
			Route: s.Route, Direction: s.Direction.String(), Trains: s.Trains, Changes: []int{},
			From: int64(s.From), To: int64(s.To), WindowFrom: int64(s.WindowFrom), WindowTo: int64(s.WindowTo),
			RouteLength: int64(target.Track.Length()), Segments: Segments(target.Track, s.WindowFrom, s.WindowTo),
			Before: steps(s.Before), After: steps(s.After),
			Places: Places(a.Routes[s.Route].Target, s.Direction, s.WindowFrom, s.WindowTo),
		}
		for _, c := range s.Changes {
			doc.Changes = append(doc.Changes, groups[s.Route][c])
		}
		out.List = append(out.List, doc)
	}
	return out
}

func steps(list []diff.Step) []Step {
	out := make([]Step, len(list))
	for i, s := range list {
		out[i] = Step{From: int64(s.From), To: int64(s.To), Speed: int(s.Speed), Source: s.Sources}
	}
	return out
}

// Segments writes the chainage of a track between two running distances.
func Segments(t *chainage.Track, from, to unit.Distance) []Segment {
	out := []Segment{}
	for _, s := range t.Segments() {
		start, end := max(from, s.Start), min(to, s.End())
		if start < end {
			out = append(out, Segment{Chainage: int64(s.From + start - s.Start), From: int64(start), To: int64(end)})
		}
	}
	return out
}

// Places lists the places of a route, for a direction of travel, between two
// running distances, in the order of the track.
func Places(r *schema.Route, d codes.Direction, from, to unit.Distance) []Place {
	out := []Place{}
	for _, p := range r.Places {
		if p.Directions.Has(d) && p.End >= from && p.Start <= to {
			out = append(out, Place{From: int64(p.Start), To: int64(p.End), Kind: string(p.Kind), Name: p.Name})
		}
	}
	slices.SortStableFunc(out, func(a, b Place) int { return cmp.Compare(a.From, b.From) })
	return out
}
