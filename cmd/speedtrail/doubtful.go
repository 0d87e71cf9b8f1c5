package main

import (
	"fmt"
	"slices"
	"strings"

	"speedtrail/diff/doubt"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// doubtfulNames lists what requests and acceptances name and a data set does not
// have. It is no fault of the data set: old requests outlive routes, and only the
// requests in play are held to it, by assess. Beside that it lists checks that are off
// and axle load rows that do nothing.
func doubtfulNames(d *schema.Dataset) []string {
	var list []string
	add := func(at source.Position, format string, args ...any) {
		list = append(list, at.String()+": "+fmt.Sprintf(format, args...))
	}
	if off := doubt.Unchecked(d.Limits); len(off) > 0 {
		for i, id := range off {
			off[i] = id + " (" + doubt.LimitKey(id) + ")"
		}
		add(source.Position{File: "dataset.toml"}, "not looked for, as [limits] sets no limit: %s", strings.Join(off, ", "))
	}
	var routes, trains []string
	for _, r := range d.Routes {
		for i := range r.AxleLoad {
			if row := &r.AxleLoad[i]; row.Limit == ([codes.AxleLoads]unit.Speed{}) {
				add(row.Pos, "the row gives no speed to any category and restricts no train")
			}
		}
		routes = append(routes, r.ID)
	}
	for _, t := range d.Trains {
		trains = append(trains, t.ID)
	}
	// span looks for a stretch, and tells whether the revision lacks what it names;
	// point: a place without length is a stretch, too.
	span := func(at schema.Places, what, id string, s schema.Span, point bool) (lacking bool) {
		r := routeByID(d, id)
		if r == nil {
			add(at.Route, "%s names route %s, which is not in this revision%s", what, source.Quote(id), schema.Meant(id, routes))
			return true
		}
		from, errFrom := r.Track.Locate(s.From)
		to, errTo := r.Track.Locate(s.To)
		switch {
		case errFrom != nil:
			add(at.From, "%s: on route %s, from_km %s is %s", what, id, s.From, schema.LocationProblem(r.Track, s.From, errFrom))
		case errTo != nil:
			add(at.To, "%s: on route %s, to_km %s is %s", what, id, s.To, schema.LocationProblem(r.Track, s.To, errTo))
		case from > to || from == to && !point:
			how := "does not lie after"
			if from == to {
				how = "is the same place as"
			}
			add(at.To, "%s: to_km %s %s from_km %s along route %s; where the track has gone since, nothing need be done", what, s.To, how, s.From, id)
		}
		return errFrom != nil || errTo != nil
	}
	for _, q := range d.Requests {
		what := "request " + q.ID
		lacking := false
		if len(q.Declare) == 0 {
			add(q.Pos, "%s declares nothing", what)
		}
		for _, x := range q.Declare {
			lacking = span(x.Places, what, x.Route, x.Span, false) || lacking
			for k, id := range x.Trains {
				if !slices.Contains(trains, id) {
					lacking = true
					add(x.Places.Trains[k], "%s names train %s, which is not in this revision%s", what, source.Quote(id), schema.Meant(id, trains))
				}
			}
		}
		if lacking {
			add(q.Pos, "%s: assess refuses it where it is in play and names what neither side has", what)
		}
	}
	for _, a := range d.Accepted {
		if !slices.Contains(doubt.IDs, a.Finding) {
			known := schema.Meant(a.Finding, doubt.IDs)
			if known == "" {
				known = "; these are: " + strings.Join(doubt.IDs, ", ")
			}
			add(a.Places.Finding, "the entry accepts nothing: %s is none of the findings that can be accepted%s", source.Quote(a.Finding), known)
			continue
		}
		span(a.Places, "the entry", a.Route, a.Span, true)
	}
	return list
}
