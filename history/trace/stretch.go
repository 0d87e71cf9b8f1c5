package trace

import (
	"cmp"
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema"
	"speedtrail/schema/unit"
)

// Piece is a stretch of today's profile of one speed that dates from one
// revision: the newest one that brought the speed, on the way back along the
// first of the parents that have it.
type Piece struct {
	step.Piece                  // on the newest track
	Origin     int32            // the commit
	Sources    []profile.Source // the rows that govern it today
	Before     []step.Piece     // what was before the origin, in the first of its parents; empty where the history begins
	Across     int              // how many revisions that do not load lie between
}

// Band is the profile on a stretch over a run of commits on the line of first
// parents.
type Band struct {
	From    int32 // the first of them
	Gap     bool  // they do not load
	Profile step.Func
}

// Stretch finds the origin of each piece of a train's profile between two
// running distances on the newest track.
func (v *View) Stretch(t schema.Train, from, to unit.Distance) []Piece {
	profiles := make([]step.Func, len(v.versions))
	none := step.Func{{From: from, To: to}}
	at := func(c int32) step.Func {
		s := v.h.State[c]
		if s < 0 {
			return none
		}
		if profiles[s] == nil {
			profiles[s] = v.version(s).profileOn(t, from, to)
		}
		return profiles[s]
	}
	// What is still to be dated, handed back from commit to commit. Children come
	// before their parents, so that a commit has all that it gets.
	open := map[int32][]step.Piece{v.h.Tip: at(v.h.Tip)}
	var found []Piece
	for _, c := range v.line.order {
		todo := joined(open[c])
		delete(open, c)
		for _, p := range v.line.before[c] {
			if len(todo) == 0 {
				break
			}
			if v.h.State[p] == v.h.State[c] {
				open[p] = append(open[p], todo...)
				todo = nil
				break
			}
			equal, rest := split(todo, at(p))
			if len(equal) > 0 {
				open[p] = append(open[p], equal...)
			}
			todo = rest
		}
		for _, p := range todo {
			piece := Piece{Piece: p, Origin: c, Across: int(v.line.across[c])}
			if before := v.line.before[c]; len(before) > 0 {
				piece.Before = cut(at(before[0]), p.From, p.To)
			}
			found = append(found, piece)
		}
	}
	slices.SortFunc(found, func(a, b Piece) int { return cmp.Compare(a.From, b.From) })
	newest := v.version(v.h.State[v.h.Tip])
	var list []Piece
	for _, p := range found {
		if n := len(list); n > 0 && list[n-1].Speed == p.Speed && list[n-1].Origin == p.Origin {
			last := &list[n-1]
			last.To = p.To
			last.Before = joined(append(last.Before, p.Before...))
			continue
		}
		list = append(list, p)
	}
	for i := range list {
		p := &list[i]
		p.Sources = newest.governing(t, p.From, p.To, p.Speed)
	}
	return list
}

// Bands gives the profile on a stretch along the line of first parents, the
// oldest first.
func (v *View) Bands(t schema.Train, from, to unit.Distance) []Band {
	var list []Band
	last := int32(-3)
	for _, c := range slices.Backward(v.FirstParents()) {
		s := v.h.State[c]
		if s == last {
			continue
		}
		last = s
		b := Band{From: c, Gap: s == Gap, Profile: step.Func{{From: from, To: to}}}
		if s >= 0 {
			b.Profile = v.version(s).profileOn(t, from, to)
		}
		if n := len(list); n > 0 && list[n-1].Gap == b.Gap && slices.Equal(list[n-1].Profile, b.Profile) {
			continue
		}
		list = append(list, b)
	}
	return list
}

// split sorts pieces into the parts where f has their speed and the rest.
func split(pieces []step.Piece, f step.Func) (equal, rest []step.Piece) {
	for _, p := range pieces {
		for cur := f.CursorAt(p.From); p.From < p.To; {
			cur.Advance(p.From)
			part := p
			part.To = min(p.To, cur.Piece().To)
			if cur.Piece().Speed == p.Speed {
				equal = append(equal, part)
			} else {
				rest = append(rest, part)
			}
			p.From = part.To
		}
	}
	return joined(equal), joined(rest)
}

// cut gives the pieces of f within a window.
func cut(f step.Func, from, to unit.Distance) []step.Piece {
	var list []step.Piece
	for cur := f.CursorAt(from); from < to; {
		cur.Advance(from)
		p := step.Piece{From: from, To: min(to, cur.Piece().To), Speed: cur.Piece().Speed}
		list = append(list, p)
		from = p.To
	}
	return list
}

// joined sorts pieces and joins those that touch and have one speed.
func joined(list []step.Piece) []step.Piece {
	slices.SortFunc(list, func(a, b step.Piece) int { return cmp.Compare(a.From, b.From) })
	out := list[:0:0]
	for _, p := range list {
		if n := len(out); n > 0 && out[n-1].To == p.From && out[n-1].Speed == p.Speed {
			out[n-1].To = p.To
			continue
		}
		out = append(out, p)
	}
	return out
}
