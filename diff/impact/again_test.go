package impact

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/step"
	"speedtrail/schema/unit"
)

// A run in used memory that takes times over from another is the same to the
// last bit as a new one.
func TestComputeAgain(t *testing.T) {
	taken := 0
	rapid.Check(t, func(t *rapid.T) {
		draw := func(pieces int) (f step.Func) {
			at := unit.Distance(0)
			for range pieces {
				to := at + unit.Distance(rapid.IntRange(1, 2000).Draw(t, "length"))*unit.Metre
				f = f.Append(step.Piece{From: at, To: to, Speed: unit.Speed(5 * rapid.IntRange(1, 30).Draw(t, "speed"))})
				at = to
			}
			return f
		}
		f := draw(rapid.IntRange(1, 12).Draw(t, "pieces"))
		g := draw(rapid.IntRange(1, 12).Draw(t, "pieces"))
		if rapid.IntRange(0, 3).Draw(t, "alike") > 0 { // one stretch differs
			end := f[len(f)-1].To
			from := unit.Distance(rapid.Int64Range(0, int64(end)).Draw(t, "from"))
			to := unit.Distance(rapid.Int64Range(int64(from), int64(end)).Draw(t, "to"))
			g = step.Func(nil).AppendPart(f, 0, from).Append(step.Piece{From: from, To: to, Speed: 45}).AppendPart(f, to, end)
		}
		m := Motion{rapid.IntRange(1, 1500).Draw(t, "acceleration"), rapid.IntRange(1, 1500).Draw(t, "braking"), rapid.Bool().Draw(t, "rolling")}
		like := newRun(f, m)
		var r Run
		r.Compute(draw(5), m, nil)
		r.Compute(g, m, like)
		want := newRun(g, m)
		if !slices.Equal(r.edges, want.edges) || !slices.Equal(r.times, want.times) || !slices.Equal(r.reached, want.reached) {
			t.Fatalf("got %v, want %v", r, want)
		}
		if from, to := r.takeOver(like); from > 0 || to < len(g) {
			taken++
		}
	})
	if !testing.Short() && taken < 20 {
		t.Errorf("times were taken over %d times", taken)
	}
}

// A piece of the same profile is run otherwise where the train comes into it, or has
// to leave it, at another speed.
func TestTakeOverSameEdges(t *testing.T) {
	m := Motion{Acceleration: 500, Braking: 500, Rolling: true}
	for name, c := range map[string]struct {
		like, f  step.Func
		from, to int // the pieces that are left
	}{
		"all":                 {profileOf(1000, 60, 3000, 100), profileOf(1000, 60, 3000, 100), 2, 2},
		"comes in faster":     {profileOf(1000, 60, 3000, 100), profileOf(1000, 80, 3000, 100), 0, 2},
		"leaves faster":       {profileOf(2000, 100, 3000, 60), profileOf(2000, 100, 3000, 80), 0, 2},
		"the same at one end": {profileOf(1000, 60, 3000, 100, 4000, 50), profileOf(1000, 60, 3000, 100, 4000, 70), 1, 3},
		"and at the other":    {profileOf(1000, 50, 3000, 100, 4000, 60), profileOf(1000, 70, 3000, 100, 4000, 60), 0, 2},
	} {
		var r Run
		r.Compute(c.f, m, newRun(c.like, m))
		if want := newRun(c.f, m); !slices.Equal(r.times, want.times) {
			t.Errorf("%s: times %v, want %v", name, r.times, want.times)
		}
		if from, to := r.takeOver(newRun(c.like, m)); from != c.from || to != c.to {
			t.Errorf("%s: %d to %d are left, want %d to %d", name, from, to, c.from, c.to)
		}
	}
	if from, to := newRun(profileOf(1000, 60), m).takeOver(newRun(profileOf(1000, 60), Motion{Acceleration: 500, Braking: 501, Rolling: true})); from != 0 || to != 1 {
		t.Errorf("a run by another motion: %d to %d are left", from, to)
	}
}

func TestLesser(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		limit := mmps(unit.Speed(5 * rapid.IntRange(0, 120).Draw(t, "limit")))
		if rapid.Bool().Draw(t, "any") {
			limit = rapid.Float64Range(1e-3, 200_000).Draw(t, "limit")
		}
		square := rapid.Float64Range(0, 4e10).Draw(t, "square")
		for range rapid.IntRange(0, 1).Draw(t, "near") {
			square = limit * limit
			for range rapid.IntRange(0, 3).Draw(t, "steps") {
				square = math.Nextafter(square, float64(rapid.IntRange(0, 1).Draw(t, "up"))*1e12)
			}
		}
		if got, want := lesser(limit, square), min(limit, math.Sqrt(square)); got != want {
			t.Fatalf("lesser(%v, %v): %v, want %v", limit, square, got, want)
		}
	})
}
