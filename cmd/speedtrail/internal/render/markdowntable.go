package render

import "strings"

// mostPadded is how wide the cells of a column are filled up to. Longer ones stand out:
// one long id would else push every row out of the window.
const mostPadded = 32

// rightAligned begins the head of a column of numbers.
const rightAligned = ">"

// table writes a table whose columns stand below each other also in the file itself,
// which is read as it is in a terminal, a mail or a text diff. Cells are escaped
// already.
func (m *markdown) table(heads []string, rows [][]string) {
	widths := make([]int, len(heads))
	right := make([]bool, len(heads))
	for i, h := range heads {
		heads[i], right[i] = strings.CutPrefix(h, rightAligned)
		widths[i] = max(3, Cells(heads[i]))
		for _, row := range rows {
			if n := Cells(row[i]); n <= mostPadded {
				widths[i] = max(widths[i], n)
			}
		}
	}
	line := func(cells []string) {
		var b strings.Builder
		for i, cell := range cells {
			switch blanks := strings.Repeat(" ", max(0, widths[i]-Cells(cell))); {
			case right[i]:
				cell = blanks + cell
			case i < len(cells)-1:
				cell += blanks
			}
			b.WriteString("| " + cell + " ")
		}
		m.add("%s|\n", b.String())
	}
	rule := make([]string, len(heads))
	for i := range heads {
		rule[i] = strings.Repeat("-", widths[i])
		if right[i] {
			rule[i] = rule[i][1:] + ":"
		}
	}
	m.add("\n")
	line(heads)
	line(rule)
	for _, row := range rows {
		line(row)
	}
}
