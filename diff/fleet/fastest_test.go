package fleet

import (
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/profile"
)

// Selections are what the rows give to the 1,144 classes, each once, in the
// order of the categories.
func TestSelectionsAreThoseOfEveryClass(t *testing.T) {
	most := 0
	check(t, 150, func(t *rapid.T) {
		w := draw(t, 0)
		filter := [...]profile.Filter{profile.All, profile.NoTemporary}[w.dice(0, 1)]
		c := profile.New(w.target, w.direction, filter)
		var want []profile.Selection
		for _, class := range everyClass() {
			s := c.Select(class)
			if !slices.ContainsFunc(want, func(x profile.Selection) bool { return slices.Equal(x, s) }) {
				want = append(want, s)
			}
		}
		got := Selections(c)
		if !slices.EqualFunc(got, want, func(a, b profile.Selection) bool { return slices.Equal(a, b) }) {
			t.Fatalf("%v%d selections %v, want %d %v", w, len(got), got, len(want), want)
		}
		most = max(most, len(want))
	})
	if !t.Failed() && most < 20 {
		t.Errorf("at most %d selections were drawn", most)
	}
}
