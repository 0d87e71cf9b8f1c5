package align_test

import (
	"cmp"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/align"
	"speedtrail/schema/unit"
)

// row is something that holds on a stretch.
type row struct {
	from, to unit.Distance
	speed    int
}

// Law: where nothing is unshared both lists have the same rows, and equal lists share
// everything.
func TestUnshared(t *testing.T) {
	byPlace := func(a, b *row) int { return cmp.Or(cmp.Compare(a.from, b.from), cmp.Compare(a.to, b.to)) }
	same := func(a, b *row) bool { return *a == *b }
	where := func(r *row) align.Interval { return align.Interval{From: r.from, To: r.to} }
	rapid.Check(t, func(t *rapid.T) {
		draw := rapid.Custom(func(t *rapid.T) row {
			from := unit.Distance(rapid.IntRange(0, 8).Draw(t, "from"))
			return row{from, from + unit.Distance(rapid.IntRange(1, 4).Draw(t, "length")), rapid.IntRange(1, 2).Draw(t, "speed")}
		})
		sides := [2][]row{rapid.SliceOfN(draw, 0, 6).Draw(t, "base"), rapid.SliceOfN(draw, 0, 6).Draw(t, "target")}
		if rapid.Bool().Draw(t, "mostly the same") {
			sides[1] = append(slices.Clone(sides[0]), sides[1][:min(1, len(sides[1]))]...)
		}
		for i := range sides {
			slices.SortFunc(sides[i], func(a, b row) int { return cmp.Or(byPlace(&a, &b), cmp.Compare(a.speed, b.speed)) })
		}
		found := align.Unshared(sides[0], sides[1], byPlace, same, where)
		at := func(list []row, s unit.Distance) (speeds []int) {
			for _, r := range list {
				if r.from <= s && s < r.to {
					speeds = append(speeds, r.speed)
				}
			}
			slices.Sort(speeds)
			return speeds
		}
		for s := range unit.Distance(14) {
			if b, a := at(sides[0], s), at(sides[1], s); !align.Touches(found, s, s+1) && !slices.Equal(b, a) {
				t.Fatalf("%v and %v differ at %d, outside %v", sides[0], sides[1], s, found)
			}
		}
		if same := align.Unshared(sides[0], sides[0], byPlace, same, where); len(same) > 0 {
			t.Fatalf("of %v and itself %v is not shared", sides[0], same)
		}
		for _, x := range found {
			if !slices.ContainsFunc(append(slices.Clone(sides[0]), sides[1]...), func(r row) bool { return x.From == r.from }) {
				t.Fatalf("%v begins where no row does", x)
			}
		}
	})
}
