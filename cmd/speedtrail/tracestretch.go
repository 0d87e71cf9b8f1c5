package main

import (
	"context"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/diff/step"
	"speedtrail/history/assessment"
	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// mostBands is how many revisions a picture of a stretch shows.
const mostBands = 60

// ends locates the stretch that was asked for.
func (t *tracing) ends() (from, to unit.Distance, err error) {
	if from, err = located(t.route, "--from", t.call.from); err != nil {
		return 0, 0, err
	}
	if to, err = located(t.route, "--to", t.call.to); err != nil {
		return 0, 0, err
	}
	if from >= to {
		return 0, 0, badCall("positions follow the nominal direction", "--to %s does not lie after --from %s", t.call.to, t.call.from)
	}
	return from, to, nil
}

func (t *tracing) stretch(ctx context.Context) error {
	from, to, err := t.ends()
	if err != nil {
		return err
	}
	track := t.route.Track
	t.doc.From, t.doc.To = track.Begins(from).String(), track.Ends(to).String()
	t.doc.Segments = assessment.Segments(track, from, to)
	views := t.views()
	found := map[codes.Direction][][]trace.Piece{}
	for d, v := range views {
		for _, train := range t.trains {
			pieces := v.Stretch(train, from, to)
			found[d] = append(found[d], pieces)
			for _, p := range pieces {
				t.name(p.Origin)
			}
		}
	}
	t.number()
	for _, d := range codes.AllDirections {
		if views[d] != nil && len(t.doc.Places) == 0 {
			t.doc.Places = assessment.Places(t.route, d, from, to)
		}
		seen := map[string]int{}
		for i, pieces := range found[d] {
			out, err := t.profiles(d, pieces, views[d].Bands(t.trains[i], from, to))
			if err != nil {
				return err
			}
			for k := range pieces {
				p, said := &pieces[k], &out.Pieces[k]
				for _, x := range []struct {
					by  *[]string
					all bool
				}{{&said.DeclaredBy, true}, {&said.DeclaredInPart, false}} {
					if *x.by, err = t.declaredBy(ctx, p.Origin, func(q *schema.ChangeRequest) bool {
						some, all := views[d].DeclaredOn(q, t.trains[i], p)
						return some && all == x.all
					}); err != nil {
						return err
					}
				}
			}
			var n int
			t.doc.Stretches, n = withTrain(t.doc.Stretches, seen, out, func(x *render.TraceStretch) *[]string { return &x.Trains }, t.trains[i].ID)
			t.pieces = with(t.pieces, n, sighted[[]trace.Piece]{views[d], t.trains[i], pieces})
		}
	}
	return nil
}

// profiles writes what is found of a stretch without its trains: the pieces of today,
// and the profiles of the newest revisions.
func (t *tracing) profiles(d codes.Direction, pieces []trace.Piece, bands []trace.Band) (render.TraceStretch, error) {
	track := t.route.Track
	out := render.TraceStretch{Direction: d.String(), Pieces: []render.TracePiece{}, Bands: []render.TraceBand{}}
	for _, p := range pieces {
		out.Pieces = append(out.Pieces, render.TracePiece{
			From: track.Begins(p.From).String(), To: track.Ends(p.To).String(), Start: int64(p.From), End: int64(p.To), Speed: int(p.Speed),
			Origin: t.rank[p.Origin], Sources: assessment.Sources(p.Sources), Before: levels(p.Before), Across: p.Across, Overtaken: []int64{},
		})
	}
	out.LeftOut = max(0, len(bands)-mostBands)
	for _, b := range bands[out.LeftOut:] {
		committed, err := t.committed(b.From)
		if err != nil {
			return out, err
		}
		out.Bands = append(out.Bands, render.TraceBand{Committed: committed, Gap: b.Gap, Pieces: levels(b.Profile)})
	}
	return out, nil
}

func levels(list []step.Piece) []render.TraceLevel {
	out := make([]render.TraceLevel, len(list))
	for i, p := range list {
		out[i] = render.TraceLevel{Start: int64(p.From), End: int64(p.To), Speed: int(p.Speed)}
	}
	return out
}
