package assessment

import "speedtrail/diff"

// requests writes the requests in play with what of each was seen.
func requests(a *diff.Account) []Request {
	out := []Request{}
	next := 0
	for i, q := range a.Requests {
		r := Request{ID: q.ID, Title: q.Title, Reason: q.Reason, File: q.Pos.File, Declares: []Declaration{}}
		for k, d := range q.Declare {
			doc := Declaration{
				Line: d.Pos.Line, Route: d.Route, Direction: d.Span.Directions.String(), Effect: d.Effect.String(),
				From: d.Span.From.String(), To: d.Span.To.String(), Trains: append([]string{}, d.Trains...), Seen: []Seen{},
			}
			if next < len(a.Declared) && a.Declared[next].Request == i && a.Declared[next].Declaration == k {
				seen := &a.Declared[next]
				next++
				doc.Track, doc.Dated, doc.Unseen = int64(seen.Track), int64(seen.Dated), seen.Unseen() && !namesTrainThatDiffers(a, seen)
				for _, s := range seen.Seen {
					doc.Seen = append(doc.Seen, Seen{Train: a.Trains[s.Train].ID, Inside: int64(s.Inside), RunOut: int64(s.RunOut), Hidden: int64(s.Hidden)})
				}
			}
			r.Declares = append(r.Declares, doc)
		}
		out = append(out, r)
	}
	return out
}

// namesTrainThatDiffers tells whether a declaration of any effect names a
// reference train that was added, removed or altered: then that is what it
// declares.
func namesTrainThatDiffers(a *diff.Account, d *diff.Declared) bool {
	for _, t := range a.Trains {
		if t.Declared && d.Names(t.ID, a) {
			return true
		}
	}
	return false
}
