package fleet

import (
	"flag"
	"slices"
	"testing"
	"time"

	"pgregory.net/rapid"

	"speedtrail/diff/profile"
	"speedtrail/schema/unit"
)

// small is a set of classes whose categories are cut down to those that it can
// tell apart: bits of a word, numbered cant first, then set, then axle load.
type small struct {
	cants, sets, axles int
	bits               uint64
}

// shrink keeps one of the categories that the set treats alike; the fewest
// products are as many for what is left. It gives false for a set that stays
// too large to try everything.
func shrink(s *classSet) (small, bool) {
	layer := func(n int, has func(i int) [8 * 13 * 11]bool) []int {
		var kept []int
		seen := map[[8 * 13 * 11]bool]bool{}
		for i := range n {
			if x := has(i); !seen[x] {
				seen[x] = true
				kept = append(kept, i)
			}
		}
		return kept
	}
	at := func(c, k, a int) bool { return s[c][k]>>a&1 == 1 }
	cants := layer(11, func(c int) (x [8 * 13 * 11]bool) {
		for i := range 8 * 13 {
			x[i] = at(c, i/13, i%13)
		}
		return x
	})
	sets := layer(8, func(k int) (x [8 * 13 * 11]bool) {
		for i := range 11 * 13 {
			x[i] = at(i/13, k, i%13)
		}
		return x
	})
	axles := layer(13, func(a int) (x [8 * 13 * 11]bool) {
		for i := range 11 * 8 {
			x[i] = at(i/8, i%8, a)
		}
		return x
	})
	m := small{cants: len(cants), sets: len(sets), axles: len(axles)}
	if m.cants*m.sets*m.axles > 64 {
		return m, false
	}
	for i, c := range cants {
		for j, k := range sets {
			for l, a := range axles {
				if at(c, k, a) {
					m.bits |= 1 << ((i*m.sets+j)*m.axles + l)
				}
			}
		}
	}
	return m, true
}

// fewest finds with how many products the set can be written, by trying all of
// them that lie in it, one more at a time.
func (m small) fewest(most int) int {
	var boxes []uint64
	for c := 1; c < 1<<m.cants; c++ {
		for k := 1; k < 1<<m.sets; k++ {
			for a := 1; a < 1<<m.axles; a++ {
				var box uint64
				for i := range m.cants * m.sets * m.axles {
					if c>>(i/m.axles/m.sets)&1 == 1 && k>>(i/m.axles%m.sets)&1 == 1 && a>>(i%m.axles)&1 == 1 {
						box |= 1 << i
					}
				}
				if box&^m.bits == 0 {
					boxes = append(boxes, box)
				}
			}
		}
	}
	// A product inside another one is never needed.
	all := boxes
	boxes = slices.DeleteFunc(slices.Clone(all), func(b uint64) bool {
		return slices.ContainsFunc(all, func(x uint64) bool { return x != b && b&^x == 0 })
	})
	var reaches func(left uint64, n int) bool
	reaches = func(left uint64, n int) bool {
		if left == 0 {
			return true
		}
		first := left & -left
		return n > 0 && slices.ContainsFunc(boxes, func(b uint64) bool { return b&first != 0 && reaches(left&^b, n-1) })
	}
	for n := range most {
		if reaches(m.bits, n) {
			return n
		}
	}
	return most
}

// checkCover checks that the products are the set, and each of them needed.
func checkCover(t *rapid.T, s *classSet, list []Product) {
	var got classSet
	for i, p := range list {
		got.join(setOf(p))
		var rest classSet
		for k, q := range list {
			if k != i {
				rest.join(setOf(q))
			}
		}
		if rest == *s {
			t.Fatalf("%v is not needed in %v", p, list)
		}
	}
	if got != *s {
		t.Fatalf("%v is not the set %v", list, s)
	}
}

// Any set of classes is written exactly, with the fewest products that there
// are. Sets are blown up from few categories, as tables do.
func TestFewestProducts(t *testing.T) {
	largest := 0
	check(t, 400, func(t *rapid.T) {
		d := diceOf(t)
		shapes := [][3]int{{2, 2, 2}, {3, 3, 2}, {2, 3, 3}, {4, 2, 2}, {3, 3, 3}}
		sh := shapes[d(0, len(shapes)-1)]
		var kind [3][]int
		for i, n := range [3]int{11, 8, 13} {
			for range n {
				kind[i] = append(kind[i], d(0, sh[i]-1))
			}
		}
		// One draw says whether few or most of the classes are in the set.
		in := make([]bool, sh[0]*sh[1]*sh[2])
		share := d(1, 5)
		for i := range in {
			in[i] = d(0, 5) < share
		}
		var s classSet
		for _, c := range everyClass() {
			if in[(kind[0][c.Cant]*sh[1]+kind[1][c.Categories])*sh[2]+kind[2][c.AxleLoad]] {
				s[c.Cant][c.Categories] |= 1 << c.AxleLoad
			}
		}
		list := products(&s)
		checkCover(t, &s, list)
		m, ok := shrink(&s)
		if !ok {
			t.Fatalf("%d x %d x %d is too large", m.cants, m.sets, m.axles)
		}
		if want := m.fewest(len(list)); len(list) != want {
			t.Fatalf("%d products %v, but %d suffice for %v", len(list), list, want, s)
		}
		largest = max(largest, len(list))
	})
	if !t.Failed() && largest < 5 {
		t.Errorf("no set needed more than %d products", largest)
	}
	t.Logf("up to %d products", largest)
}

// The same for the sets that come of tables.
func TestFewestProductsOfAnAccount(t *testing.T) {
	tried, several, large := 0, 0, 0
	check(t, 250, func(t *rapid.T) {
		w := draw(t, 0)
		for _, x := range w.compare(profile.All, unit.Distance(w.dice(1, 25))*w.grid).Changes {
			var s classSet
			for _, p := range x.Products {
				s.join(setOf(p))
			}
			checkCover(t, &s, x.Products)
			m, ok := shrink(&s)
			if !ok || m.cants+m.sets+m.axles > 13 {
				large++
				continue
			}
			tried++
			if want := m.fewest(len(x.Products)); len(x.Products) != want {
				t.Fatalf("%v%+v: %d products, %d suffice", w, x, len(x.Products), want)
			}
			if len(x.Products) > 1 {
				several++
			}
		}
	})
	if !t.Failed() && !testing.Short() && flag.Lookup("rapid.checks").Value.String() == "100" && several < 30 {
		t.Errorf("%d changes with several products", several)
	}
	t.Logf("%d changes, %d with several products, %d too large to try", tried, several, large)
}

// Sets that no table gives are still written exactly, and in bounded time.
func TestSetsPastTheLimits(t *testing.T) {
	began := time.Now()
	check(t, 2, func(t *rapid.T) {
		d := diceOf(t)
		var s classSet
		for _, c := range everyClass() {
			if d(0, 9) > 0 {
				s[c.Cant][c.Categories] |= 1 << c.AxleLoad
			}
		}
		var got classSet
		for _, p := range products(&s) {
			got.join(setOf(p))
		}
		if got != s {
			t.Fatalf("another set")
		}
	})
	t.Log(time.Since(began))
}

// The order of the products and all else depends on the set alone.
func TestProductsAreDeterministic(t *testing.T) {
	check(t, 50, func(t *rapid.T) {
		w := draw(t, 0)
		lengths := []unit.Distance{w.grid, 9 * w.grid}
		a, b := w.compare(profile.All, lengths...), w.compare(profile.All, lengths...)
		if !slices.Equal(a.Reach, b.Reach) || !slices.EqualFunc(a.Changes, b.Changes, func(x, y Change) bool {
			return x.Delta == y.Delta && x.TrainLength == y.TrainLength && slices.Equal(x.Products, y.Products)
		}) {
			t.Fatalf("%v%+v and %+v", w, a, b)
		}
	})
}
