package diff

import (
	"speedtrail/diff/align"
	"speedtrail/diff/profile"
	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

// bareChange is a change without its train and sources, in the running
// distances of both sides. It is straight on both: a jump inside it is one that
// both revisions have.
type bareChange struct {
	base, target  unit.Distance // where it begins
	length        unit.Distance
	before, after unit.Speed
	runOut        bool
}

// compareTrain finds the changes that one train sees.
func compareTrain(base, target *profile.Compiler, before, after profile.Selection, length unit.Distance, maximum unit.Speed, cells []align.Cell) []bareChange {
	found := differences(base.Sweep(before, length, maximum), target.Sweep(after, length, maximum), cells)
	if len(found) == 0 {
		return nil
	}
	// Where a train of no length sees no difference, the change is run-out.
	return markRunOut(found, base.Sweep(before, 0, maximum), target.Sweep(after, 0, maximum))
}

// differences lists the maximal stretches on which two profiles differ, with
// constant speeds on both sides. It ends a stretch where the cells do not
// continue each other: there, the track is discontinuous on one side.
func differences(before, after step.Func, cells []align.Cell) []bareChange {
	var found []bareChange
	for k, cell := range cells {
		joined := k > 0 && cells[k-1].Continues(cell)
		b, t := before.CursorAt(cell.Base), after.CursorAt(cell.Target)
		for at := unit.Distance(0); at < cell.Length; {
			b.Advance(cell.Base + at)
			t.Advance(cell.Target + at)
			old, now := b.Piece(), t.Piece()
			next := min(cell.Length, old.To-cell.Base, now.To-cell.Target)
			if old.Speed != now.Speed {
				c := bareChange{base: cell.Base + at, target: cell.Target + at, length: next - at, before: old.Speed, after: now.Speed}
				if n := len(found) - 1; n >= 0 && (at > 0 || joined) && found[n].continues(c) {
					found[n].length += c.length
				} else {
					found = append(found, c)
				}
			}
			at = next
		}
	}
	return found
}

// continues tells whether d goes on where c ends, with the same speeds.
func (c bareChange) continues(d bareChange) bool {
	return c.target+c.length == d.target && c.base+c.length == d.base &&
		c.before == d.before && c.after == d.after
}

// markRunOut splits changes where a train of no length begins or ceases to see
// a difference.
func markRunOut(found []bareChange, before, after step.Func) []bareChange {
	split := make([]bareChange, 0, len(found))
	for _, c := range found {
		b, t := before.CursorAt(c.base), after.CursorAt(c.target)
		first := true
		for at := unit.Distance(0); at < c.length; {
			b.Advance(c.base + at)
			t.Advance(c.target + at)
			old, now := b.Piece(), t.Piece()
			next := min(c.length, old.To-c.base, now.To-c.target)
			runOut := old.Speed == now.Speed
			if n := len(split) - 1; !first && split[n].runOut == runOut {
				split[n].length += next - at
			} else {
				split = append(split, bareChange{c.base + at, c.target + at, next - at, c.before, c.after, runOut})
			}
			first, at = false, next
		}
	}
	return split
}
