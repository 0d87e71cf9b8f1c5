package trace

import (
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/schema"
	"speedtrail/schema/unit"
)

// Value is what a commit has at the point.
type Value struct {
	Commit  int32
	Speed   unit.Speed       // 0: no such track
	Sources []profile.Source // the rows that govern, as they stood
}

// Step is a commit at which the speed changed.
type Step struct {
	After Value
	// Before holds the parents with distinct speeds, in their order. It is empty
	// where the history begins.
	Before []Value
	// Across is how many revisions that do not load lie between, on the longest
	// way.
	Across int
	// Aside tells that a later merge did not take the speed: it does not lead to
	// that of the newest revision.
	Aside bool
}

// Reign is a run of commits on the line of first parents that have one speed.
type Reign struct {
	From  int32 // the first of them
	Speed unit.Speed
	Gap   bool // they do not load
}

// Trail is the past of a point for one train.
type Trail struct {
	Now   Value
	Steps []Step // the newest first
	// Line is the line of first parents, the oldest first.
	Line []Reign

	speeds []unit.Speed // of each version
}

// Point traces a train at a running distance on the newest track, 0 to its
// length. The last point of a route belongs to its last piece.
func (v *View) Point(t schema.Train, at unit.Distance) Trail {
	at = min(at, v.h.Newest().Track.Length()-1)
	speeds := make([]unit.Speed, len(v.versions))
	for s := range v.versions {
		x := v.version(int32(s))
		if own, ok := x.place(at); ok && x.compiler != nil {
			speeds[s] = x.compiler.Compile(t).At(own)
		}
	}
	speed := func(c int32) unit.Speed {
		if s := v.h.State[c]; s >= 0 {
			return speeds[s]
		}
		return 0
	}
	value := func(c int32) Value {
		out := Value{Commit: c, Speed: speed(c)}
		if s := v.h.State[c]; s >= 0 {
			out.Sources = v.version(s).governing(t, at, at+1, out.Speed)
		}
		return out
	}
	trail := Trail{Now: value(v.h.Tip), Line: v.reigns(speed), speeds: speeds}
	for _, c := range v.line.order {
		if !v.isStep(c, speed) {
			continue
		}
		s := Step{After: value(c), Across: int(v.line.across[c])}
		for _, p := range v.line.before[c] {
			if !slices.ContainsFunc(s.Before, func(b Value) bool { return b.Speed == speed(p) }) {
				s.Before = append(s.Before, value(p))
			}
		}
		trail.Steps = append(trail.Steps, s)
	}
	v.markAside(trail.Steps, speed)
	return trail
}

// isStep tells whether the speed of a commit differs from that of all before it.
func (v *View) isStep(c int32, speed func(int32) unit.Speed) bool {
	if v.h.State[c] == Gap {
		return false
	}
	before := v.line.before[c]
	if len(before) == 0 {
		return speed(c) != 0
	}
	for _, p := range before {
		// The same version has the same speed.
		if v.h.State[p] == v.h.State[c] || speed(p) == speed(c) {
			return false
		}
	}
	return true
}

// markAside finds the steps that do not lead to the newest revision: going back
// from there, a merge leads only to those parents whose speed it has, where
// there are any.
func (v *View) markAside(steps []Step, speed func(int32) unit.Speed) {
	leads := make([]bool, len(v.h.Commits))
	leads[v.h.Tip] = true
	for _, c := range v.line.order {
		if !leads[c] {
			continue
		}
		equal := false
		for _, p := range v.line.before[c] {
			if speed(p) == speed(c) {
				leads[p], equal = true, true
			}
		}
		if equal {
			continue
		}
		for _, p := range v.line.before[c] {
			leads[p] = true
		}
	}
	for i := range steps {
		steps[i].Aside = !leads[steps[i].After.Commit]
	}
}

// reigns goes along the first parents.
func (v *View) reigns(speed func(int32) unit.Speed) []Reign {
	var list []Reign
	for _, c := range slices.Backward(v.FirstParents()) {
		r := Reign{From: c, Speed: speed(c), Gap: v.h.State[c] == Gap}
		if n := len(list); n == 0 || list[n-1].Speed != r.Speed || list[n-1].Gap != r.Gap {
			list = append(list, r)
		}
	}
	return list
}

// FirstParents lists the line of first parents, the newest first.
func (v *View) FirstParents() []int32 {
	list := []int32{v.h.Tip}
	for c := v.h.Tip; len(v.h.Commits[c].Parents) > 0; {
		c = v.h.Commits[c].Parents[0]
		list = append(list, c)
	}
	return list
}

// Gaps lists the commits whose data set does not load, the newest first.
func (v *View) Gaps() []int32 {
	var list []int32
	for _, c := range v.line.order {
		if v.h.State[c] == Gap {
			list = append(list, c)
		}
	}
	return list
}

// Cut lists the commits at which a shallow clone ends, the newest first.
func (v *View) Cut() []int32 {
	var list []int32
	for _, c := range v.line.order {
		if v.h.Commits[c].Cut {
			list = append(list, c)
		}
	}
	return list
}

// Order lists all commits that count, children before their parents, otherwise
// the newest first. The caller must not change it.
func (v *View) Order() []int32 { return v.line.order }
