package main

import (
	"slices"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/trace"
)

// overtake notes which speeds an assessment does not speak of though its range holds
// their commits: it compares its base with its target, and a speed that came and went
// between them, or that a merge before the target did not take, is in none of the two.
// An anchor speaks of the speeds of its revision and of no others: where the newest
// revision has one by an older commit that the anchored one does not have.
func (t *tracing) overtake() {
	for i, trains := range t.trails {
		steps := t.doc.Trails[i].Steps
		known := map[int32][]bool{} // by commit: the steps whose speed it has, for every train
		holds := func(commit int32, step int) bool {
			if known[commit] == nil {
				known[commit] = slices.Repeat([]bool{true}, len(steps))
				for _, x := range trains {
					for n, is := range x.view.Holds(x.what, commit) {
						known[commit][n] = known[commit][n] && is
					}
				}
			}
			return known[commit][step]
		}
		for k := range steps {
			c := &t.doc.Commits[steps[k].After.Commit]
			for _, a := range c.Assessments {
				target, ok := t.targets[a.Number]
				if ok && !holds(target, k) || !ok && t.followed(steps, k, a.Number) {
					steps[k].Overtaken = append(steps[k].Overtaken, a.Number)
				}
			}
			// Before an anchor a speed may have come and gone for years.
			steps[k].AnchorOvertaken = c.InAnchor != "" && t.anchored != nil && holds(t.h.Tip, k) && !holds(*t.anchored, k)
		}
	}
	for i, trains := range t.pieces {
		for k := range t.doc.Stretches[i].Pieces {
			p := &t.doc.Stretches[i].Pieces[k]
			c := &t.doc.Commits[p.Origin]
			holds := func(commit int32) bool {
				return !slices.ContainsFunc(trains, func(x sighted[[]trace.Piece]) bool { return !x.view.HoldsPiece(x.train, x.what[k], commit) })
			}
			for _, a := range c.Assessments {
				if target, ok := t.targets[a.Number]; ok && !holds(target) {
					p.Overtaken = append(p.Overtaken, a.Number)
				}
			}
			p.AnchorOvertaken = c.InAnchor != "" && t.anchored != nil && !holds(*t.anchored)
		}
	}
}

// followed tells whether a later step is in the range of an assessment as well, of which
// the target is not in the history that is traced.
func (t *tracing) followed(steps []render.TraceStep, k int, number int64) bool {
	after := t.h.Descendants(t.named[steps[k].After.Commit])
	return slices.ContainsFunc(steps[:k], func(later render.TraceStep) bool {
		return !later.Aside && after[t.named[later.After.Commit]] &&
			slices.ContainsFunc(t.doc.Commits[later.After.Commit].Assessments, func(b render.TraceAssessment) bool { return b.Number == number })
	})
}
