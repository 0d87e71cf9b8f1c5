package main

import (
	"slices"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/trace"
)

// overtake notes which speeds an assessment does not speak of though its range holds
// their commits: it compares its base with its target, and a speed that came and went
// between them, or that a merge before the target did not take, is in none of the two.
func (t *tracing) overtake() {
	for i, trains := range t.trails {
		steps := t.doc.Trails[i].Steps
		holds := map[int64][]bool{} // by assessment: the steps whose speed its target has for every train
		for k := range steps {
			for _, a := range t.doc.Commits[steps[k].After.Commit].Assessments {
				target, ok := t.targets[a.Number]
				if ok && holds[a.Number] == nil {
					holds[a.Number] = slices.Repeat([]bool{true}, len(steps))
					for _, x := range trains {
						for n, is := range x.view.Holds(x.what, target) {
							holds[a.Number][n] = holds[a.Number][n] && is
						}
					}
				}
				if ok && !holds[a.Number][k] || !ok && t.followed(steps, k, a.Number) {
					steps[k].Overtaken = append(steps[k].Overtaken, a.Number)
				}
			}
		}
	}
	for i, trains := range t.pieces {
		for k := range t.doc.Stretches[i].Pieces {
			p := &t.doc.Stretches[i].Pieces[k]
			for _, a := range t.doc.Commits[p.Origin].Assessments {
				target, ok := t.targets[a.Number]
				if ok && slices.ContainsFunc(trains, func(x sighted[[]trace.Piece]) bool { return !x.view.HoldsPiece(x.train, x.what[k], target) }) {
					p.Overtaken = append(p.Overtaken, a.Number)
				}
			}
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
