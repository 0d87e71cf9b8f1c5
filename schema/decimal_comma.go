package schema

import (
	"slices"
	"strings"

	"speedtrail/schema/source"
	"speedtrail/schema/table"
)

// shiftedAt is where a decimal comma shows, which makes two cells of one number and
// shifts all that follow it into other columns. Where columns are optional nothing
// else may be wrong with such a row: 0,005,10,050,60 lies between 0 and 5.
type shiftedAt struct {
	// Columns of positions that have another one behind them, or one of numbers.
	positions, numbers []int
	words              []int // columns of words
}

// textColumns hold what people write; wordColumns hold one of a few words.
var (
	textColumns = []string{"id", "name", "reason", "note", "valid_from", "valid_to"}
	wordColumns = []string{"direction", "train_length_delay", "hand", "kind"}
)

func shiftedIn(t *table.CSV) (at shiftedAt) {
	for i, column := range t.Columns {
		switch {
		case column == "from_km" || column == "to_km" || column == "km":
			switch {
			case i+1 == len(t.Columns) || slices.Contains(textColumns, t.Columns[i+1]):
			case strings.HasSuffix(t.Columns[i+1], "km"):
				at.positions = append(at.positions, i)
			default:
				at.numbers = append(at.numbers, i)
			}
		case slices.Contains(wordColumns, column) || strings.HasSuffix(column, "_rule"):
			at.words = append(at.words, i)
		}
	}
	return at
}

// decimalComma records a row that a decimal comma has shifted: a position without
// decimals before one that begins with 0 as no number does, or a number where a word
// has to stand.
func (r *reader) decimalComma(t *table.CSV, row table.Row, at *shiftedAt) bool {
	if r.twoCells(row, at.positions) {
		return true
	}
	for _, i := range at.words {
		// One digit can be the value that the standard has for the word.
		if c := row.At(i); len(c.Text) > 1 && digits(c.Text) {
			if r.twoCells(row, at.numbers) {
				return true
			}
			r.faults.Add(c.Pos, "%s %s is a number; a comma as decimal sign makes two cells of one number, write a point", t.Columns[i], source.Quote(c.Text))
			return true
		}
	}
	return false
}

// twoCells records a position whose decimals stand in the cell behind it. A speed such
// as 095 can stand there, too: only of a faulty row they are taken for decimals.
func (r *reader) twoCells(row table.Row, columns []int) bool {
	for _, i := range columns {
		whole, rest := row.At(i), row.At(i+1)
		if len(rest.Text) > 1 && rest.Text[0] == '0' && digits(rest.Text) && digits(strings.TrimPrefix(whole.Text, "-")) {
			r.faults.Add(whole.Pos, "%s,%s are two cells; the decimal sign is a point, write %s.%s", whole.Text, rest.Text, whole.Text, rest.Text)
			return true
		}
	}
	return false
}

// digits tells whether a text is made of digits only.
func digits(s string) bool {
	for i := range len(s) {
		if s[i] < '0' || s[i] > '9' {
			return false
		}
	}
	return s != ""
}
