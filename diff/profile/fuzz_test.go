package profile_test

import (
	"math/rand/v2"
	"testing"

	"speedtrail/diff/internal/metre"
	"speedtrail/diff/profile"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// thrown makes dice of bytes, one for each draw; where they run out every draw
// is the lowest.
func thrown(data []byte) metre.Dice {
	return func(low, high int) int {
		if len(data) == 0 {
			return low
		}
		n := int(data[0])
		data = data[1:]
		return low + n%(high-low+1)
	}
}

// FuzzProfile compiles the profile of a small route that the bytes draw, and
// holds it against the model, which goes metre by metre: speeds everywhere, the
// pieces as long as they can be, and the rows that govern each.
func FuzzProfile(f *testing.F) {
	f.Add([]byte{})
	rnd := rand.New(rand.NewPCG(5, 7))
	for size := 16; size <= 512; size *= 2 {
		for range 4 {
			seed := make([]byte, size)
			for i := range seed {
				seed[i] = byte(rnd.Uint32())
			}
			f.Add(seed)
		}
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		d := thrown(data)
		w := drawn{dice: d, grid: d.Grid()}
		w.direction = codes.Direction(d(0, 1))
		w.train = d.Train("t", 7, w.grid)
		// An edited sketch has rows that continue others, too.
		w.route = d.Sketch("r").Edited(d).Route(d, w.grid)
		if !w.route.Directions.Has(w.direction) {
			w.direction = 1 - w.direction
		}
		want := metre.Profile(w.route, w.train, w.direction, metre.All, w.grid)
		c := profile.New(w.route, w.direction, profile.All)
		at := unit.Distance(0)
		pieces := c.Profile(w.train)
		for i, p := range pieces {
			if p.From != at || p.To <= p.From || p.From%w.grid != 0 || p.To%w.grid != 0 || i > 0 && pieces[i-1].Speed == p.Speed {
				t.Fatalf("%vpieces are not maximal and without gaps: %v", w, pieces)
			}
			at = p.To
			for n := p.From / w.grid; n < p.To/w.grid; n++ {
				if want[n].Speed != p.Speed {
					t.Fatalf("%v%d at %s m, want %d", w, p.Speed, (n * w.grid).M(), want[n].Speed)
				}
			}
			checkSources(t, w, p.Sources, want, p.From, p.To)
		}
		if at != w.route.Track.Length() {
			t.Fatalf("%vthe profile ends at %s m", w, at.M())
		}
	})
}
