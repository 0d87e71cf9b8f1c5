package diff

import (
	"speedtrail/diff/align"
	"speedtrail/diff/delta"
	"speedtrail/diff/profile"
	"speedtrail/schema/unit"
)

// compareTrain finds the differences that one train sees.
func compareTrain(base, target *profile.Compiler, before, after profile.Selection, length unit.Distance, maximum unit.Speed, cells []align.Cell) []delta.Delta {
	found := delta.Between(base.Sweep(before, length, maximum), target.Sweep(after, length, maximum), cells)
	if len(found) == 0 {
		return nil
	}
	return delta.MarkRunOut(found, base.Sweep(before, 0, maximum), target.Sweep(after, 0, maximum))
}
