package main

import (
	"fmt"
	"slices"
	"strings"

	"speedtrail/diff/doubt"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// doubtfulNames lists what requests and acceptances name and a data set does not
// have. It is no fault of the data set: old requests outlive routes, and only the
// requests in play are held to it, by assess.
func doubtfulNames(d *schema.Dataset) []string {
	var list []string
	add := func(at source.Position, format string, args ...any) {
		list = append(list, at.String()+": "+fmt.Sprintf(format, args...))
	}
	trains := map[string]bool{}
	for _, t := range d.Trains {
		trains[t.ID] = true
	}
	span := func(at source.Position, what, id string, s schema.Span) {
		r := routeByID(d, id)
		if r == nil {
			add(at, "%s names route %s, which is not in this revision; assess refuses a request in play that names what neither side has", what, source.Quote(id))
			return
		}
		from, errFrom := r.Track.Locate(s.From)
		to, errTo := r.Track.Locate(s.To)
		switch {
		case errFrom != nil:
			add(at, "%s: from_km %s is %v of route %s", what, s.From, errFrom, id)
		case errTo != nil:
			add(at, "%s: to_km %s is %v of route %s", what, s.To, errTo, id)
		case from >= to:
			how := "does not lie after"
			if from == to {
				how = "is the same place as"
			}
			add(at, "%s: to_km %s %s from_km %s along route %s; where the track has gone since, nothing need be done", what, s.To, how, s.From, id)
		}
	}
	if off := doubt.Unchecked(d.Limits); len(off) > 0 {
		for i, id := range off {
			off[i] = id + " (" + doubt.LimitKey(id) + ")"
		}
		add(source.Position{File: "dataset.toml"}, "not looked for, as [limits] sets no limit: %s", strings.Join(off, ", "))
	}
	for _, q := range d.Requests {
		what := "request " + q.ID
		if len(q.Declare) == 0 {
			add(q.Pos, "%s declares nothing", what)
		}
		for _, x := range q.Declare {
			span(x.Pos, what, x.Route, x.Span)
			for _, id := range x.Trains {
				if !trains[id] {
					add(x.Pos, "%s names train %s, which is not in this revision", what, source.Quote(id))
				}
			}
		}
	}
	for _, a := range d.Accepted {
		if !slices.Contains(doubt.IDs, a.Finding) {
			add(a.Pos, "the entry accepts nothing: %s is none of the findings that can be accepted", source.Quote(a.Finding))
			continue
		}
		span(a.Pos, "the entry", a.Route, a.Span)
	}
	return list
}
