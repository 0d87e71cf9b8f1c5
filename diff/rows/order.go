package rows

import (
	"cmp"
	"math"
	"slices"
	"strings"

	"speedtrail/schema/chainage"
)

const (
	// cellLimit bounds the table of the search for the smallest account; past
	// it, rows are paired by their positions only.
	cellLimit = 1_000_000
	// mostParts is how many rows one can be split into and still be recognised.
	mostParts = 8
)

// The prices of an account: a listed cell, and each row that a reader has to
// look at.
const (
	cellPrice = 2
	rowPrice  = 3
)

// inOrder accounts for rows that no name identifies: both sides in the order of
// the track, the cheapest way from one to the other.
func (m *matcher) inOrder(a, b []int) []Difference {
	m.sort(0, a)
	m.sort(1, b)
	if len(a)*len(b) > cellLimit {
		return m.samePlace(a, b)
	}
	var first []way
	best := make([][]way, len(a)+1) // of what is left of both sides
	for i := range best {
		best[i] = make([]way, len(b)+1)
	}
	for i := len(a); i >= 0; i-- {
		for k := len(b); k >= 0; k-- {
			if i == len(a) && k == len(b) {
				continue
			}
			first = m.firstSteps(first[:0], a[i:], b[k:])
			found := way{price: math.MaxInt}
			for _, w := range first {
				if w.price += best[i+w.a][k+w.b].price; w.price < found.price {
					found = w
				}
			}
			best[i][k] = found
		}
	}
	var list []Difference
	for i, k := 0, 0; i < len(a) || k < len(b); {
		w := best[i][k]
		list = append(list, m.difference(a[i:i+w.a], b[k:k+w.b]))
		i, k = i+w.a, k+w.b
	}
	return list
}

// way is a way through what is left of both sides, known by its first step.
type way struct {
	price int
	a, b  int // how many rows the first step takes on each side
}

// sort puts rows of a side in the order of the track.
func (m *matcher) sort(side int, list []int) {
	slices.SortStableFunc(list, func(x, y int) int {
		p, q := m.row(side, x), m.row(side, y)
		return cmp.Or(cmp.Compare(p.Start, q.Start), cmp.Compare(p.To.Chainage, q.To.Chainage),
			strings.Compare(strings.Join(p.Cells, "\x00"), strings.Join(q.Cells, "\x00")))
	})
}

// firstSteps appends the steps that can be taken from the first rows of both sides, each
// with its own price: two rows that belong together, one that was split, some that
// were merged, one that is on one side only.
func (m *matcher) firstSteps(list []way, a, b []int) []way {
	if len(a) > 0 && len(b) > 0 {
		if m.related(a[0], b[0]) {
			list = append(list, way{rowPrice + cellPrice*len(m.cells(a[0], b[0])), 1, 1})
		}
		for n := 2; n <= mostParts && n <= len(b); n++ {
			if m.covers(0, a[0], 1, b[:n]) {
				list = append(list, way{rowPrice + n + cellPrice*m.otherCells(a[:1], b[:n]), 1, n})
			}
		}
		for n := 2; n <= mostParts && n <= len(a); n++ {
			if m.covers(1, b[0], 0, a[:n]) {
				list = append(list, way{rowPrice + n + cellPrice*m.otherCells(a[:n], b[:1]), n, 1})
			}
		}
	}
	if len(a) > 0 {
		list = append(list, way{rowPrice + m.filled(0, a[0]), 1, 0})
	}
	if len(b) > 0 {
		list = append(list, way{rowPrice + m.filled(1, b[0]), 0, 1})
	}
	return list
}

// difference makes the entry for rows that belong together.
func (m *matcher) difference(a, b []int) Difference {
	d := Difference{Old: slices.Clone(a), New: slices.Clone(b)}
	switch {
	case len(a) == 0:
		d.Kind = Added
		return d
	case len(b) == 0:
		d.Kind = Removed
		return d
	case len(b) > 1:
		d.Kind = Split
	case len(a) > 1:
		d.Kind = Merged
	default:
		d.Kind = Altered
	}
	for _, k := range b {
		// A merged row is accounted for from the first of its parts.
		d.Cells = append(d.Cells, m.cells(a[0], k)...)
	}
	return d
}

// related tells whether a new row can be an old one with other cells: they
// overlap or share an end, or only their place differs.
func (m *matcher) related(i, k int) bool {
	p, q := &m.old.Rows[i], &m.now.Rows[k]
	if p.From == q.From || p.To == q.To {
		return true
	}
	if p.From.Chainage < q.To.Chainage && q.From.Chainage < p.To.Chainage {
		return true
	}
	return m.otherCells([]int{i}, []int{k}) == 0
}

// covers tells whether rows of one side touch and together cover exactly what
// one row of the other side covers.
func (m *matcher) covers(side, whole, other int, parts []int) bool {
	w := m.row(side, whole)
	if m.old.FromColumn < 0 || w.From != m.row(other, parts[0]).From || w.To != m.row(other, parts[len(parts)-1]).To {
		return false
	}
	for n := range len(parts) - 1 {
		if m.row(other, parts[n]).To != m.row(other, parts[n+1]).From {
			return false
		}
	}
	return true
}

// otherCells counts the cells, positions aside, in which rows differ.
func (m *matcher) otherCells(a, b []int) (n int) {
	for _, i := range a {
		for _, k := range b {
			for _, c := range m.cells(i, k) {
				if c.Column != m.old.FromColumn && c.Column != m.old.ToColumn {
					n++
				}
			}
		}
	}
	return n
}

// filled counts the cells of a row that are not blank.
func (m *matcher) filled(side, i int) (n int) {
	for _, cell := range m.row(side, i).Cells {
		if cell != "" {
			n++
		}
	}
	return n
}

// samePlace pairs rows that cover the same stretch, for tables that differ in
// too many rows to search.
func (m *matcher) samePlace(a, b []int) []Difference {
	type span struct{ from, to chainage.Point }
	at := map[span][]int{}
	for _, k := range b {
		s := span{m.now.Rows[k].From, m.now.Rows[k].To}
		at[s] = append(at[s], k)
	}
	paired := map[int]bool{}
	var list []Difference
	for _, i := range a {
		s := span{m.old.Rows[i].From, m.old.Rows[i].To}
		if rest := at[s]; len(rest) > 0 {
			at[s] = rest[1:]
			paired[rest[0]] = true
			list = append(list, m.altered(i, rest[0]))
			continue
		}
		list = append(list, Difference{Kind: Removed, Old: []int{i}})
	}
	for _, k := range b {
		if !paired[k] {
			list = append(list, Difference{Kind: Added, New: []int{k}})
		}
	}
	return list
}
