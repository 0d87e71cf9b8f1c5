// Package rows accounts for the differences between two tables row by row:
// which rows were added, removed or altered, which one was split into several
// or merged from several.
//
// Rows are matched by what they say and where, not by where they stand in the
// file, and the account is the smallest that is found: a boundary that moved is
// two altered cells, not two removed and two added rows.
//
//	rows.Compare(old, now) // [{Kind: Altered, Old: [3], New: [3], Cells: [{basic 90 110}]}]
//
// Law: Apply(old, Compare(old, now)) gives the rows of now, in some order.
package rows

import (
	"cmp"
	"slices"
	"strings"

	"speedtrail/schema/chainage"
	"speedtrail/schema/unit"
)

// Row is a row of a table.
type Row struct {
	Line     int    // in its file
	Name     string // what identifies the row in its table, if anything does
	From, To chainage.Point
	Start    unit.Distance // running distance of From, for the order of the track
	Cells    []string      // as written, by column; the columns of both tables are the same
}

// Table is the rows of a file with the names of their columns. FromColumn and
// ToColumn are the columns of the positions, -1 where there are none.
type Table struct {
	Columns              []string
	FromColumn, ToColumn int
	Rows                 []Row
}

// Kind says how rows differ.
type Kind uint8

// The kinds of difference.
const (
	Added   Kind = iota
	Removed      // only the old table has it
	Altered      // the same row with other cells
	Split        // one old row, several new ones that cover it exactly
	Merged       // several old rows that touch, one new one that covers them exactly
)

// String gives a plain word.
func (k Kind) String() string {
	return [...]string{"added", "removed", "altered", "split", "merged"}[k]
}

// Cell is a cell that differs between a row of Old and a row of New.
type Cell struct {
	Column   int
	Old, New int // indices of the rows in their tables
}

// Difference is one entry of an account. Old and New are indices of rows, in
// the order of the track.
type Difference struct {
	Kind     Kind
	Old, New []int
	Cells    []Cell
}

// Compare makes the account of two tables with the same columns.
func Compare(old, now *Table) []Difference {
	m := matcher{old: old, now: now}
	a, b := m.unequal()
	var list []Difference
	a, b, list = m.byName(a, b)
	list = append(list, m.inOrder(a, b)...)
	slices.SortStableFunc(list, func(x, y Difference) int { return cmp.Compare(m.place(x), m.place(y)) })
	return list
}

// Apply gives the rows that a table has after the differences.
func Apply(old, now *Table, list []Difference) [][]string {
	gone := make([]bool, len(old.Rows))
	var out [][]string
	for _, d := range list {
		for _, i := range d.Old {
			gone[i] = true
		}
		if d.Kind == Added {
			for _, i := range d.New {
				out = append(out, now.Rows[i].Cells)
			}
			continue
		}
		// Everything else is made from the old rows and the listed cells.
		for k, i := range d.New {
			cells := slices.Clone(old.Rows[d.Old[min(k, len(d.Old)-1)]].Cells)
			for _, c := range d.Cells {
				if c.New == i {
					cells[c.Column] = now.Rows[i].Cells[c.Column]
				}
			}
			out = append(out, cells)
		}
	}
	for i, row := range old.Rows {
		if !gone[i] {
			out = append(out, row.Cells)
		}
	}
	return out
}

// matcher holds the two tables that are compared.
type matcher struct{ old, now *Table }

// place is where a difference stands along the track.
func (m *matcher) place(d Difference) unit.Distance {
	if len(d.New) > 0 {
		return m.now.Rows[d.New[0]].Start
	}
	return m.old.Rows[d.Old[0]].Start
}

// unequal leaves out the rows that both tables have.
func (m *matcher) unequal() (a, b []int) {
	key := func(r *Row) string { return strings.Join(r.Cells, "\x00") }
	have := map[string][]int{}
	for i := range m.old.Rows {
		k := key(&m.old.Rows[i])
		have[k] = append(have[k], i)
	}
	for i := range m.now.Rows {
		k := key(&m.now.Rows[i])
		if list := have[k]; len(list) > 0 {
			have[k] = list[1:]
			continue
		}
		b = append(b, i)
	}
	for i := range m.old.Rows {
		k := key(&m.old.Rows[i])
		if list := have[k]; len(list) > 0 && list[0] == i {
			have[k] = list[1:]
			a = append(a, i)
		}
	}
	return a, b
}

// byName pairs rows whose name occurs once on both sides.
func (m *matcher) byName(a, b []int) (restA, restB []int, list []Difference) {
	names := map[string][2][]int{}
	for side, rows := range [2][]int{a, b} {
		for _, i := range rows {
			name := m.row(side, i).Name
			entry := names[name]
			entry[side] = append(entry[side], i)
			names[name] = entry
		}
	}
	paired := func(side, i int) bool {
		name := m.row(side, i).Name
		return name != "" && len(names[name][0]) == 1 && len(names[name][1]) == 1
	}
	for _, i := range a {
		if !paired(0, i) {
			restA = append(restA, i)
			continue
		}
		list = append(list, m.altered(i, names[m.old.Rows[i].Name][1][0]))
	}
	for _, i := range b {
		if !paired(1, i) {
			restB = append(restB, i)
		}
	}
	return restA, restB, list
}

func (m *matcher) row(side, i int) *Row {
	if side == 0 {
		return &m.old.Rows[i]
	}
	return &m.now.Rows[i]
}

// altered makes the difference between an old and a new row.
func (m *matcher) altered(i, k int) Difference {
	return Difference{Altered, []int{i}, []int{k}, m.cells(i, k)}
}

// cells lists the cells that differ between an old and a new row.
func (m *matcher) cells(i, k int) []Cell {
	var list []Cell
	for c := range m.old.Columns {
		if m.old.Rows[i].Cells[c] != m.now.Rows[k].Cells[c] {
			list = append(list, Cell{c, i, k})
		}
	}
	return list
}
