package fleet

import (
	"math/bits"
	"slices"

	"speedtrail/schema/codes"
)

// classSet is any set of train classes: for each cant deficiency category and
// set of other categories, a mask of axle load categories.
type classSet [codes.CantDeficiencies][codes.CategorySets]uint16

// closureLimit and nodeLimit bound the search for the fewest products. Sets
// that come from real tables stay far below; past the limits the result is
// still exact as a set, only perhaps not in the fewest products.
const (
	closureLimit = 512
	nodeLimit    = 20_000
)

// products writes a set of classes as a union of products, the fewest that are
// found. They may overlap.
func products(set *classSet) []Product {
	boxes := maximal(set)
	// The largest first: a good cover is then found early, and the result reads
	// from the general to the particular.
	slices.SortStableFunc(boxes, func(a, b Product) int { return b.Size() - a.Size() })
	s := search{boxes: boxes, best: greedy(set, boxes)}
	s.try(*set, nil)
	return s.best
}

// greedy covers the set by taking, again and again, the product with the most
// classes that are still left.
func greedy(set *classSet, boxes []Product) []Product {
	left := *set
	var list []Product
	for !left.empty() {
		best, most := boxes[0], 0
		for _, b := range boxes {
			if n := left.count(b); n > most {
				best, most = b, n
			}
		}
		left.remove(best)
		list = append(list, best)
	}
	return list
}

// search looks for a smaller cover than the best so far.
type search struct {
	boxes []Product
	best  []Product
	nodes int
}

func (s *search) try(left classSet, taken []Product) {
	s.nodes++
	if left.empty() {
		if len(taken) < len(s.best) {
			s.best = slices.Clone(taken)
		}
		return
	}
	if len(taken)+1 >= len(s.best) || s.nodes > nodeLimit {
		return
	}
	// One of the products that hold the first class left has to be taken.
	cant, cats, axle := left.first()
	for _, b := range s.boxes {
		if b.Cant>>cant&1 == 1 && b.Sets>>cats&1 == 1 && b.Axle>>axle&1 == 1 {
			rest := left
			rest.remove(b)
			s.try(rest, append(taken, b))
		}
	}
}

func (s *classSet) empty() bool { return *s == classSet{} }

func (s *classSet) first() (cant, cats, axle int) {
	for c := range s {
		for k, mask := range s[c] {
			if mask != 0 {
				return c, k, bits.TrailingZeros16(mask)
			}
		}
	}
	return 0, 0, 0
}

func (s *classSet) remove(p Product) {
	for c := range s {
		if p.Cant>>c&1 == 0 {
			continue
		}
		for k := range s[c] {
			if p.Sets>>k&1 == 1 {
				s[c][k] &^= p.Axle
			}
		}
	}
}

func (s *classSet) count(p Product) (n int) {
	for c := range s {
		if p.Cant>>c&1 == 0 {
			continue
		}
		for k := range s[c] {
			if p.Sets>>k&1 == 1 {
				n += bits.OnesCount16(s[c][k] & p.Axle)
			}
		}
	}
	return n
}

// maximal lists the products inside the set that cannot be made larger. A
// product is maximal when each of its three sets is all that the other two
// allow; those are found by intersecting rows, and in each intersection
// columns.
func maximal(set *classSet) []Product {
	rows := make([][codes.CategorySets]uint16, 0, len(set))
	for c := range set {
		rows = append(rows, set[c])
	}
	rows = closure(rows, func(a, b [codes.CategorySets]uint16) [codes.CategorySets]uint16 {
		for k := range a {
			a[k] &= b[k]
		}
		return a
	})
	seen := map[Product]bool{}
	var boxes []Product
	for _, row := range rows {
		masks := closure(row[:], func(a, b uint16) uint16 { return a & b })
		for _, axle := range masks {
			if axle == 0 {
				continue
			}
			p := Product{Axle: axle}
			for k, mask := range row {
				if mask&axle == axle {
					p.Sets |= 1 << k
				}
			}
			for c := range set {
				if contains(&set[c], p) {
					p.Cant |= 1 << c
				}
			}
			if !seen[p] {
				seen[p] = true
				boxes = append(boxes, p)
			}
		}
	}
	return boxes
}

// contains tells whether a row of the set holds the sets and axle loads of p.
func contains(row *[codes.CategorySets]uint16, p Product) bool {
	for k, mask := range row {
		if p.Sets>>k&1 == 1 && mask&p.Axle != p.Axle {
			return false
		}
	}
	return true
}

// closure lists the distinct items and all that come of joining them, in an
// order that depends on the items alone.
func closure[T comparable](items []T, join func(a, b T) T) []T {
	var list []T
	seen := map[T]bool{}
	add := func(x T) {
		if !seen[x] {
			seen[x] = true
			list = append(list, x)
		}
	}
	for _, x := range items {
		add(x)
	}
	distinct := len(list)
	for i := 0; i < len(list) && len(list) < closureLimit; i++ {
		for k := range distinct {
			add(join(list[i], list[k]))
		}
	}
	return list
}
