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
	l := &doubtful{data: d}
	for _, r := range d.Routes {
		l.routes = append(l.routes, r.ID)
	}
	for _, t := range d.Trains {
		l.trains = append(l.trains, t.ID)
	}
	l.unchecked()
	l.idleRows()
	for _, q := range d.Requests {
		l.request(q)
	}
	for _, a := range d.Accepted {
		l.acceptance(a)
	}
	return l.list
}

// doubtful gathers what is doubtful about a data set.
type doubtful struct {
	data           *schema.Dataset
	routes, trains []string // ids
	list           []string
}

func (l *doubtful) add(at source.Position, format string, args ...any) {
	l.list = append(l.list, at.String()+": "+fmt.Sprintf(format, args...))
}

// unchecked lists the checks that no limit asks for.
func (l *doubtful) unchecked() {
	off := doubt.Unchecked(l.data.Limits)
	if len(off) == 0 {
		return
	}
	for i, id := range off {
		off[i] = id + " (" + doubt.LimitKey(id) + ")"
	}
	l.add(source.Position{File: "dataset.toml"}, "not looked for, as [limits] sets no limit: %s", strings.Join(off, ", "))
}

// idleRows lists the axle load rows that do nothing.
func (l *doubtful) idleRows() {
	for _, r := range l.data.Routes {
		for i := range r.AxleLoad {
			if row := &r.AxleLoad[i]; row.Limit == ([codes.AxleLoads]unit.Speed{}) {
				l.add(row.Pos, "the row gives no speed to any category and restricts no train")
			}
		}
	}
}

// request looks at what a request declares.
func (l *doubtful) request(q schema.ChangeRequest) {
	what := "request " + q.ID
	lacking := false
	if len(q.Declare) == 0 {
		l.add(q.Pos, "%s declares nothing", what)
	}
	for _, x := range q.Declare {
		lacking = l.span(x.Places, what, x.Route, x.Span, false) || lacking
		for k, id := range x.Trains {
			if !slices.Contains(l.trains, id) {
				lacking = true
				l.add(x.Places.Trains[k], "%s names train %s, which is not in this revision%s", what, source.Quote(id), schema.Meant(id, l.trains))
			}
		}
	}
	if lacking {
		l.add(q.Pos, "%s: assess refuses it where it is in play and names what neither side has", what)
	}
}

// acceptance looks at an entry of accepted.toml.
func (l *doubtful) acceptance(a schema.Acceptance) {
	if slices.Contains(doubt.IDs, a.Finding) {
		l.span(a.Places, "the entry", a.Route, a.Span, true)
		return
	}
	known := schema.Meant(a.Finding, doubt.IDs)
	if known == "" {
		known = "; these are: " + strings.Join(doubt.IDs, ", ")
	}
	l.add(a.Places.Finding, "the entry accepts nothing: %s is none of the findings that can be accepted%s", source.Quote(a.Finding), known)
}

// span looks for a stretch that something names, and tells whether the revision lacks
// its route or one of its ends; point: a place without length is a stretch, too.
func (l *doubtful) span(at schema.Places, what, id string, s schema.Span, point bool) (lacking bool) {
	r := routeByID(l.data, id)
	if r == nil {
		l.add(at.Route, "%s names route %s, which is not in this revision%s", what, source.Quote(id), schema.Meant(id, l.routes))
		return true
	}
	from, errFrom := r.Track.Locate(s.From)
	to, errTo := r.Track.Locate(s.To)
	switch {
	case errFrom != nil:
		l.add(at.From, "%s: on route %s, from_km %s is %s", what, id, s.From, schema.LocationProblem(r.Track, s.From, errFrom))
	case errTo != nil:
		l.add(at.To, "%s: on route %s, to_km %s is %s", what, id, s.To, schema.LocationProblem(r.Track, s.To, errTo))
	case from > to || from == to && !point:
		how := "does not lie after"
		if from == to {
			how = "is the same place as"
		}
		l.add(at.To, "%s: to_km %s %s from_km %s along route %s; where the track has gone since, nothing need be done", what, s.To, how, s.From, id)
	}
	return errFrom != nil || errTo != nil
}
