// Package delta finds the stretches on which two profiles differ, laid side by
// side by their chainage.
//
//	delta.Between(before, after, cells) // [{Base: 0, Target: 0, Length: 500000, Before: 90, After: 110}]
package delta

import (
	"speedtrail/diff/align"
	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

// Delta is a maximal stretch on which the speeds of both sides are constant and
// differ. It is straight on both: a chainage jump inside it is one that both
// revisions have.
type Delta struct {
	Base, Target  unit.Distance // running distances of its beginning
	Length        unit.Distance
	Before, After unit.Speed
	// RunOut: a train of no length would see no difference here.
	RunOut bool
}

// Between lists the maximal stretches on which two profiles differ. No cell goes on
// where the one before it ends, as package align makes them, and neighbouring pieces
// of a profile differ: no stretch goes on where another ends.
func Between(before, after step.Func, cells []align.Cell) []Delta {
	var found []Delta
	for _, cell := range cells {
		b, t := before.CursorAt(cell.Base), after.CursorAt(cell.Target)
		for at := unit.Distance(0); at < cell.Length; {
			b.Advance(cell.Base + at)
			t.Advance(cell.Target + at)
			old, now := b.Piece(), t.Piece()
			next := min(cell.Length, old.To-cell.Base, now.To-cell.Target)
			if old.Speed != now.Speed {
				found = append(found, Delta{Base: cell.Base + at, Target: cell.Target + at, Length: next - at, Before: old.Speed, After: now.Speed})
			}
			at = next
		}
	}
	return found
}

// MarkRunOut splits differences where a train of no length begins or ceases to see
// a difference: before and after are the profiles of that train.
func MarkRunOut(found []Delta, before, after step.Func) []Delta {
	split := make([]Delta, 0, len(found))
	for _, c := range found {
		b, t := before.CursorAt(c.Base), after.CursorAt(c.Target)
		first := true
		for at := unit.Distance(0); at < c.Length; {
			b.Advance(c.Base + at)
			t.Advance(c.Target + at)
			old, now := b.Piece(), t.Piece()
			next := min(c.Length, old.To-c.Base, now.To-c.Target)
			runOut := old.Speed == now.Speed
			if n := len(split) - 1; !first && split[n].RunOut == runOut {
				split[n].Length += next - at
			} else {
				split = append(split, Delta{c.Base + at, c.Target + at, next - at, c.Before, c.After, runOut})
			}
			first, at = false, next
		}
	}
	return split
}
