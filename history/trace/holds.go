package trace

import (
	"speedtrail/diff/align"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/unit"
)

// Holds tells of the steps of a trail whether a commit has the speed of each because of
// it: going back from the commit, others that have its speed lead to the step. What
// came and went before the commit, or was set aside by a merge, does not.
func (v *View) Holds(t Trail, commit int32) []bool {
	holds := make([]bool, len(t.Steps))
	if v.h.State[commit] == Gap {
		return holds
	}
	speed := func(c int32) unit.Speed {
		if s := v.h.State[c]; s >= 0 {
			return t.speeds[s]
		}
		return 0
	}
	leads := make([]bool, len(v.h.Commits))
	leads[commit] = true
	for _, c := range v.line.order {
		if !leads[c] {
			continue
		}
		for _, p := range v.line.before[c] {
			leads[p] = leads[p] || speed(p) == speed(c)
		}
	}
	for i, s := range t.Steps {
		holds[i] = leads[s.After.Commit]
	}
	return holds
}

// HoldsPiece tells the same of a piece of a stretch: whether a commit has its speed,
// on all of it, because of the revision that it dates from.
func (v *View) HoldsPiece(t schema.Train, p Piece, commit int32) bool {
	// with gives the parts of some stretches on which a commit has the speed.
	with := func(c int32, list []align.Interval) (out []align.Interval) {
		if v.h.State[c] == Gap {
			return nil
		}
		f := step.Func{{From: p.From, To: p.To}}
		if s := v.h.State[c]; s >= 0 {
			f = v.version(s).profileOn(t, p.From, p.To)
		}
		for _, x := range list {
			for _, own := range cut(f, x.From, x.To) {
				if own.Speed == p.Speed {
					out = append(out, align.Interval{From: own.From, To: own.To})
				}
			}
		}
		return align.Union(out)
	}
	whole := []align.Interval{{From: p.From, To: p.To}}
	holds := make([][]align.Interval, len(v.h.Commits))
	holds[commit] = with(commit, whole)
	for _, c := range v.line.order {
		if c == p.Origin {
			break
		}
		if len(holds[c]) == 0 {
			continue
		}
		for _, before := range v.line.before[c] {
			list := holds[c]
			if v.h.State[before] != v.h.State[c] {
				list = with(before, list)
			}
			holds[before] = align.Union(append(holds[before], list...))
		}
	}
	x := holds[p.Origin]
	return len(x) == 1 && x[0] == whole[0]
}
