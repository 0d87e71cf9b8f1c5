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
	sort := func(side int, list []int) {
		slices.SortStableFunc(list, func(x, y int) int {
			p, q := m.row(side, x), m.row(side, y)
			return cmp.Or(cmp.Compare(p.Start, q.Start), cmp.Compare(p.To.Chainage, q.To.Chainage),
				strings.Compare(strings.Join(p.Cells, "\x00"), strings.Join(q.Cells, "\x00")))
		})
	}
	sort(0, a)
	sort(1, b)
	if len(a)*len(b) > cellLimit {
		return m.samePlace(a, b)
	}
	// price[i][k] is the least price of accounting for a[i:] and b[k:].
	type way struct {
		price int
		a, b  int // how many rows are taken on each side
	}
	best := make([][]way, len(a)+1)
	for i := range best {
		best[i] = make([]way, len(b)+1)
	}
	for i := len(a); i >= 0; i-- {
		for k := len(b); k >= 0; k-- {
			if i == len(a) && k == len(b) {
				continue
			}
			found := way{price: math.MaxInt}
			take := func(price, da, db int) {
				if p := price + best[i+da][k+db].price; p < found.price {
					found = way{p, da, db}
				}
			}
			if i < len(a) && k < len(b) {
				if m.related(a[i], b[k]) {
					take(rowPrice+cellPrice*len(m.cells(a[i], b[k])), 1, 1)
				}
				for n := 2; n <= mostParts && k+n <= len(b); n++ {
					if m.covers(0, a[i], 1, b[k:k+n]) {
						take(rowPrice+n+cellPrice*m.otherCells(a[i:i+1], b[k:k+n]), 1, n)
					}
				}
				for n := 2; n <= mostParts && i+n <= len(a); n++ {
					if m.covers(1, b[k], 0, a[i:i+n]) {
						take(rowPrice+n+cellPrice*m.otherCells(a[i:i+n], b[k:k+1]), n, 1)
					}
				}
			}
			if i < len(a) {
				take(rowPrice+m.filled(0, a[i]), 1, 0)
			}
			if k < len(b) {
				take(rowPrice+m.filled(1, b[k]), 0, 1)
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
