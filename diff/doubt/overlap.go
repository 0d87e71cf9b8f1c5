package doubt

import (
	"cmp"
	"iter"
	"slices"

	"speedtrail/schema"
	"speedtrail/schema/unit"
)

// speeds finds the rows of speed.csv on a stretch without a look at all of them.
type speeds struct {
	byStart []*schema.SpeedRow
	reach   []unit.Distance // the furthest end of the rows up to each
}

func newSpeeds(rows []schema.SpeedRow) speeds {
	var s speeds
	for i := range rows {
		s.byStart = append(s.byStart, &rows[i])
	}
	slices.SortStableFunc(s.byStart, func(a, b *schema.SpeedRow) int { return cmp.Compare(a.Start, b.Start) })
	var end unit.Distance
	for _, row := range s.byStart {
		end = max(end, row.End)
		s.reach = append(s.reach, end)
	}
	return s
}

// on gives the rows that cover some of from <= x < to, by their start.
func (s *speeds) on(from, to unit.Distance) iter.Seq[*schema.SpeedRow] {
	return func(yield func(*schema.SpeedRow) bool) {
		first, _ := slices.BinarySearch(s.reach, from+1)
		for _, row := range s.byStart[first:] {
			if row.Start >= to {
				return
			}
			if row.End > from && !yield(row) {
				return
			}
		}
	}
}
