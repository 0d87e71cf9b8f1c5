package main

import (
	"cmp"
	"context"
	"fmt"
	"slices"
	"time"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/assessment"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/codes"
)

// tracing makes the document of a trace.
type tracing struct {
	app    *app
	repo   *revision.Repo
	folder string
	h      *trace.History
	call   traceCall
	route  *schema.Route
	trains []schema.Train
	view   *trace.View // in the first direction
	doc    render.Trace

	rank  map[int32]int // of a commit: its index in doc.Commits
	named []int32       // those
	// requests are those in play at the commits that were asked for.
	requests map[int32][]schema.ChangeRequest

	targets  map[int64]int32 // of each assessment whose target is in the history that is traced
	anchored *int32          // the anchored revision, where it is
	// What a trail and a stretch of the document say of each of their trains.
	trails [][]sighted[trace.Trail]
	pieces [][]sighted[[]trace.Piece]
}

// sighted is what a train sees in a view.
type sighted[T any] struct {
	view  *trace.View
	train schema.Train
	what  T
}

// choose takes the trains that were asked for, and begins the document.
func (t *tracing) choose(data *schema.Dataset) error {
	t.trains = data.Trains
	if len(t.call.trains) > 0 {
		t.trains = nil
		for _, id := range t.call.trains {
			train, err := trainOf(data, id)
			if err != nil {
				return err
			}
			t.trains = append(t.trains, train)
		}
	}
	t.doc = render.Trace{
		Folder: t.folder, Route: t.route.ID, RouteName: t.route.Name, FirstParent: t.call.firstParent,
		Trails: []render.TraceTrail{}, Stretches: []render.TraceStretch{}, Gaps: []render.TraceGap{}, Cut: []int{}, Commits: []render.TraceCommit{},
		Places: []assessment.Place{}, Segments: []assessment.Segment{},
	}
	return nil
}

// views gives a view for each direction that was asked for.
func (t *tracing) views() map[codes.Direction]*trace.View {
	views := map[codes.Direction]*trace.View{}
	for _, d := range codes.AllDirections {
		if !(t.call.directions & t.route.Directions).Has(d) {
			continue
		}
		if t.view == nil {
			t.view = t.h.View(d, t.call.firstParent)
			views[d] = t.view
		} else {
			views[d] = t.view.With(d)
		}
	}
	return views
}

func (t *tracing) point(ctx context.Context) error {
	at, err := located(t.route, "--at", t.call.at)
	if err != nil {
		return err
	}
	t.doc.At = t.route.Track.Begins(at).String()
	if typed := t.route.Track.Ends(at).String(); typed != t.doc.At {
		t.app.remark("km %s and km %s are one point, a chainage jump; it belongs to the track that begins there", typed, t.doc.At)
	}
	trails := map[codes.Direction][]trace.Trail{}
	views := t.views()
	for d, v := range views {
		for _, train := range t.trains {
			trail := v.Point(train, at)
			trails[d] = append(trails[d], trail)
			t.name(trail.Now.Commit)
			for _, s := range trail.Steps {
				t.name(s.After.Commit)
				for _, b := range s.Before {
					t.name(b.Commit)
				}
			}
		}
	}
	t.number()
	for _, d := range codes.AllDirections {
		seen := map[string]int{}
		for i, trail := range trails[d] {
			out, err := t.trail(d, &trail)
			if err != nil {
				return err
			}
			for k := range trail.Steps {
				s := &trail.Steps[k]
				if out.Steps[k].DeclaredBy, err = t.declaredBy(ctx, s.After.Commit, func(q *schema.ChangeRequest) bool { return views[d].DeclaredAt(q, t.trains[i], at, s) }); err != nil {
					return err
				}
			}
			var n int
			t.doc.Trails, n = withTrain(t.doc.Trails, seen, out, func(x *render.TraceTrail) *[]string { return &x.Trains }, t.trains[i].ID)
			t.trails = with(t.trails, n, sighted[trace.Trail]{views[d], t.trains[i], trail})
		}
	}
	return nil
}

// withTrain adds to a list what is said of a train; where an earlier item says the same,
// the train joins that one. seen has the places of items by what they say; at is that of
// the item.
func withTrain[T any](list []T, seen map[string]int, item T, trains func(*T) *[]string, train string) (_ []T, at int) {
	said := fmt.Sprint(item)
	at, ok := seen[said]
	if !ok {
		at = len(list)
		seen[said], list = at, append(list, item)
	}
	of := trains(&list[at])
	*of = append(*of, train)
	return list, at
}

// with adds what one more train sees to the list of an item, the last one or the next.
func with[T any](lists [][]sighted[T], at int, seen sighted[T]) [][]sighted[T] {
	if at == len(lists) {
		lists = append(lists, nil)
	}
	lists[at] = append(lists[at], seen)
	return lists
}

// trail writes a trail without its trains.
func (t *tracing) trail(d codes.Direction, trail *trace.Trail) (render.TraceTrail, error) {
	out := render.TraceTrail{Direction: d.String(), Now: t.value(trail.Now), Steps: []render.TraceStep{}, Line: []render.TraceReign{}}
	for _, s := range trail.Steps {
		step := render.TraceStep{After: t.value(s.After), Before: []render.TraceValue{}, Across: s.Across, Aside: s.Aside, Overtaken: []int64{}}
		for _, b := range s.Before {
			step.Before = append(step.Before, t.value(b))
		}
		out.Steps = append(out.Steps, step)
	}
	for _, r := range trail.Line {
		committed, err := t.committed(r.From)
		if err != nil {
			return out, err
		}
		out.Line = append(out.Line, render.TraceReign{Committed: committed, Gap: r.Gap, Speed: int(r.Speed)})
	}
	return out, nil
}

func (t *tracing) value(v trace.Value) render.TraceValue {
	return render.TraceValue{Commit: t.rank[v.Commit], Speed: int(v.Speed), Sources: assessment.Sources(v.Sources)}
}

// committed writes when a commit was made. Of second 0 the history does not tell
// whether it is a time or stands for none.
func (t *tracing) committed(c int32) (string, error) {
	commit := &t.h.Commits[c]
	if commit.When != 0 {
		return instant(time.Unix(commit.When, 0)), nil
	}
	whole, err := t.repo.Resolve(commit.Hash.String())
	if err != nil {
		return "", err
	}
	return instant(whole.Committer.When), nil
}

// name notes that the document refers to a commit.
func (t *tracing) name(c int32) { t.named = append(t.named, c) }

// number gives the commits that are named, and the gaps, their places: the
// newest first.
func (t *tracing) number() {
	gaps, cut := t.view.Gaps(), t.view.Cut()
	t.named = append(append(t.named, gaps...), cut...)
	places := make([]int32, len(t.h.Commits))
	for i, c := range t.view.Order() {
		places[c] = int32(i)
	}
	slices.SortFunc(t.named, func(a, b int32) int { return cmp.Compare(places[a], places[b]) })
	t.named = slices.Compact(t.named)
	t.rank = make(map[int32]int, len(t.named))
	for i, c := range t.named {
		t.rank[c] = i
	}
	for _, c := range gaps {
		t.doc.Gaps = append(t.doc.Gaps, render.TraceGap{Commit: t.rank[c], Fault: validText(t.h.Commits[c].Gap)})
	}
	for _, c := range cut {
		t.doc.Cut = append(t.doc.Cut, t.rank[c])
	}
}

// describe fills in what is said of each commit.
func (t *tracing) describe(ctx context.Context) error {
	assessed, err := t.assessments(ctx)
	if err != nil {
		return err
	}
	changed := t.changedAt()
	for i, c := range t.named {
		hash := t.h.Commits[c].Hash
		commit, err := t.repo.Resolve(hash.String())
		if err != nil {
			return err
		}
		list, anchor, err := assessed(c)
		if err != nil {
			return err
		}
		out := render.TraceCommit{
			Anchor: anchor.entry, InAnchor: anchor.within, AnchorSignOffs: anchor.signOffs, AnchorRevoked: anchor.revoked,
			Hash: commit.Hash, Author: person(commit.Author), Authored: instant(commit.Author.When),
			Committed: instant(commit.Committer.When), Subject: validText(commit.Subject),
			Requests: []render.TraceRequest{}, Assessments: list,
		}
		if changed[i] {
			requests, err := t.requestsAt(ctx, c)
			if err != nil {
				return err
			}
			for _, q := range requests {
				out.Requests = append(out.Requests, render.TraceRequest{ID: q.ID, Title: q.Title})
			}
		}
		t.doc.Commits = append(t.doc.Commits, out)
	}
	t.overtake()
	return nil
}

// changedAt tells of the commits of the document at which of them something
// changed; the others are only referred to.
func (t *tracing) changedAt() map[int]bool {
	list := map[int]bool{}
	for _, trail := range t.doc.Trails {
		for _, s := range trail.Steps {
			list[s.After.Commit] = true
		}
	}
	for _, s := range t.doc.Stretches {
		for _, p := range s.Pieces {
			list[p.Origin] = true
		}
	}
	return list
}
