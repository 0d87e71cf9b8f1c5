package diff

import (
	"cmp"
	"slices"

	"speedtrail/diff/profile"
	"speedtrail/diff/rows"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// neighbours are the differences of the files that overlap or touch, one by one.
type neighbours struct {
	of      map[Cause]int // index in members
	members [][]Cause
	reasons []Reason // NoReason: not yet looked for
}

// together gives the reason why no change comes of a difference and those
// beside it: such differences can make up for one another, as where a limit
// moves between rows of equal speed.
func (r *Route) together(c Cause, trains []Train) Reason {
	k := &r.neighbours
	if _, ok := k.of[c]; !ok {
		k.add(c.File, &r.Files[c.File])
	}
	i := k.of[c]
	if k.reasons[i] == NoReason {
		k.reasons[i] = r.reasonOf(k.members[i], trains)
	}
	return k.reasons[i]
}

func (r *Route) reasonOf(beside []Cause, trains []Train) Reason {
	for _, t := range trains {
		for _, direction := range codes.AllDirections {
			if r.causes.haveEffect(beside, direction, profile.ClassOf(t.Train)) {
				return LowerElsewhere
			}
		}
	}
	if concernsSome(func(d codes.Direction, class profile.Class) bool { return r.causes.haveEffect(beside, d, class) }) {
		return NoSuchTrain
	}
	return SameForAll
}

// add finds the neighbours of a file.
func (k *neighbours) add(file int, f *File) {
	if k.of == nil {
		k.of = map[Cause]int{}
	}
	spans := make([][2]unit.Distance, len(f.Rows))
	order := make([]int, len(f.Rows))
	for i := range f.Rows {
		spans[i], order[i] = f.chainages(&f.Rows[i]), i
	}
	slices.SortFunc(order, func(a, b int) int { return cmp.Or(cmp.Compare(spans[a][0], spans[b][0]), cmp.Compare(a, b)) })
	var end unit.Distance
	for n, i := range order {
		if n == 0 || spans[i][0] > end {
			k.members, k.reasons = append(k.members, nil), append(k.reasons, NoReason)
			end = spans[i][1]
		}
		end = max(end, spans[i][1])
		last := len(k.members) - 1
		k.members[last] = append(k.members[last], Cause{file, i})
		k.of[Cause{file, i}] = last
	}
}

// chainages gives the lowest and the highest chainage of the rows of a
// difference.
func (f *File) chainages(d *RowDifference) (span [2]unit.Distance) {
	first := true
	for side, indices := range [...][]int{d.Old, d.New} {
		for _, i := range indices {
			row := &[...]*rows.Table{&f.Tables[d.Table].Old, &f.Tables[d.Table].New}[side].Rows[i]
			low, high := min(row.From.Chainage, row.To.Chainage), max(row.From.Chainage, row.To.Chainage)
			if first || low < span[0] {
				span[0] = low
			}
			if first || high > span[1] {
				span[1] = high
			}
			first = false
		}
	}
	return span
}
