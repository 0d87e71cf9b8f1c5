package table

import (
	"bytes"
	"encoding/csv"
	"errors"
	"iter"
	"slices"
	"strings"
	"unicode"

	"speedtrail/schema/source"
)

// Cell is a cell of a table without the blanks around it.
type Cell struct {
	Text string
	Pos  source.Position
}

// CSV is a table as it is written, with its known columns.
type CSV struct {
	Header source.Position // of the first header cell
	// Columns are the columns that the file has, in its order.
	Columns []string
	file    string
	index   map[string]int // column -> place in a row's cells
	places  []int          // place in the file's row -> place in Columns, unnamed or unknown
	rows    []Row
	cells   []Cell // room for the cells of rows to come
	// Broken tells that rows are missing because their form is faulty.
	Broken bool
}

// Row is a row of a CSV table.
type Row struct {
	table *CSV
	Pos   source.Position // of its first cell
	cells []Cell          // in the order of CSV.Columns
}

// Rows runs over the rows in the order of the file.
func (t *CSV) Rows() iter.Seq[Row] { return slices.Values(t.rows) }

// Len is the number of rows.
func (t *CSV) Len() int { return len(t.rows) }

// Has tells whether the file has a column.
func (t *CSV) Has(column string) bool { _, ok := t.index[column]; return ok }

// Cell gives the cell of a column; a blank one where the file has no such
// column.
func (r Row) Cell(column string) Cell { return r.At(r.table.Place(column)) }

// Place gives the place of a column in Columns, -1 where the file has none of
// this name: who reads many rows looks it up once.
func (t *CSV) Place(column string) int {
	if i, ok := t.index[column]; ok {
		return i
	}
	return -1
}

// At gives the cell at a place; a blank one at -1.
func (r Row) At(place int) Cell {
	if place < 0 {
		return Cell{Pos: r.Pos}
	}
	return r.cells[place]
}

// ReadCSV reads a table: comma separated, RFC 4180 quoting, header row first.
// Columns are found by name, in any order. Lines that begin with # and rows of
// blank cells only are passed over. It always gives a table, with the rows that
// could be read.
func ReadCSV(file string, content []byte, known, required []string, faults *source.Collector) *CSV {
	t := &CSV{file: file, index: map[string]int{}}
	header := false
	t.read(bytes.TrimPrefix(content, byteOrderMark), 1, faults, func(r *record) bool {
		if header {
			return true
		}
		header = true
		t.Header = r.at(0)
		t.places = t.readHeader(r, known, required, faults)
		return false
	})
	if !header && !t.Broken {
		faults.Add(source.Position{File: file, Line: 1}, "no header row, expected %s", strings.Join(known, ","))
		t.Broken = true
	}
	return t
}

// Bare gives the table without its rows, for More.
func (t *CSV) Bare() *CSV {
	return &CSV{file: t.file, Header: t.Header, Columns: t.Columns, index: t.index, places: t.places}
}

// More reads further rows of the same columns, of which the first line has a
// number. The table itself stays as it is.
func (t *CSV) More(content []byte, line int, faults *source.Collector) *CSV {
	more := t.Bare()
	more.read(content, line, faults, func(*record) bool { return true })
	return more
}

// read reads rows from lines of which the first has a number. A row that isRow
// takes for itself is none.
func (t *CSV) read(content []byte, first int, faults *source.Collector, isRow func(*record) bool) {
	at := func(line, column int) source.Position {
		return source.Position{File: t.file, Line: line + first - 1, Column: column}
	}
	if !CheckUTF8(t.file, content, faults) {
		t.Broken = true
		return
	}
	if i := bytes.IndexByte(content, 0); i >= 0 {
		faults.Add(at(1+bytes.Count(content[:i], newline), i-bytes.LastIndexByte(content[:i], '\n')), "the file holds a NUL byte, it is not text")
		t.Broken = true
		return
	}
	if line, ok := MergeMarker(content); ok {
		faults.Add(at(line, 1), "%s", Unresolved)
		t.Broken = true
		return
	}
	records := quotedRecords
	if bytes.IndexByte(content, '"') < 0 {
		records = plainRecords
	}
	for r, err := range records(t.file, content, first) {
		if err != nil {
			t.Broken = true
			recordCSVError(t.file, content, first, err, faults)
			var syntax *csv.ParseError
			if t.places != nil && errors.As(err, &syntax) {
				continue
			}
			return // what follows a header that cannot be read is no header
		}
		if !slices.ContainsFunc(r.cells, func(s string) bool { return s != "" }) {
			continue
		}
		if !isRow(r) {
			if t.places == nil {
				t.Broken = true
				return
			}
			continue
		}
		if len(t.rows) == MaxRows {
			faults.Add(source.Position{File: t.file, Line: r.at(0).Line}, "more than %d rows", MaxRows)
			t.Broken = true
			return
		}
		if row, ok := t.readRow(r, faults); ok {
			t.rows = append(t.rows, row)
		} else {
			t.Broken = true
		}
	}
}

// Places of a file's column that is none of CSV.Columns.
const (
	unnamed = -1
	unknown = -2
)

// readHeader finds the columns; nil where the table cannot be read by them.
func (t *CSV) readHeader(r *record, known, required []string, faults *source.Collector) []int {
	if len(r.cells) > MaxColumns {
		faults.Add(t.Header, "%d columns, at most %d are allowed", len(r.cells), MaxColumns)
		return nil
	}
	if len(r.cells) == 1 {
		for _, x := range [...][2]string{{";", "semicolons"}, {"\t", "tabs"}} {
			if strings.Contains(r.cells[0], x[0]) {
				faults.Add(t.Header, "columns are separated by %s, commas are needed", x[1])
				return nil
			}
		}
	}
	places := make([]int, len(r.cells))
	good := true
	for i, name := range r.cells {
		places[i] = unnamed
		switch {
		case name == "":
			if slices.ContainsFunc(r.cells[i:], func(s string) bool { return s != "" }) {
				faults.Add(r.at(i), "column without a name")
				good = false
			}
		case t.Has(name):
			faults.Add(r.at(i), "column %s stands twice", source.Quote(name))
			good = false
		case !slices.Contains(known, name):
			places[i] = unknown
			faults.Add(r.at(i), "unknown column %s, known are %s", source.Quote(name), strings.Join(known, ", "))
		default:
			places[i] = len(t.Columns)
			t.index[name] = len(t.Columns)
			t.Columns = append(t.Columns, name)
		}
	}
	for _, name := range required {
		if !t.Has(name) {
			faults.Add(source.Position{File: t.file, Line: t.Header.Line}, "column %s is missing", name)
			good = false
		}
	}
	if !good {
		return nil
	}
	return places
}

// readRow takes over the cells of a row. A row may be shorter than the header, as
// people and spreadsheets write it: the cells that are not there are blank. (A
// blank cell hides no more than one that was emptied.)
func (t *CSV) readRow(r *record, faults *source.Collector) (Row, bool) {
	row := Row{table: t, Pos: r.at(0), cells: t.room()}
	good := true
	if len(r.cells) > MaxColumns {
		faults.Add(row.Pos, "%d cells in a row, at most %d are allowed", len(r.cells), MaxColumns)
		return row, false
	}
	for i, text := range r.cells {
		if i >= len(t.places) {
			if text != "" {
				faults.Add(r.at(i), "cell %s has no column in the header; a comma as decimal sign, or in a text without quotes, gives one cell too many", source.Quote(text))
				return row, false
			}
			continue
		}
		place := t.places[i]
		if place < 0 {
			if text != "" && place == unnamed {
				faults.Add(r.at(i), "cell %s stands in a column without a name", source.Quote(text))
				good = false
			}
			continue
		}
		if problem := TextProblem(text); problem != "" {
			faults.Add(r.at(i), "text %s is %s", source.Quote(text), problem)
			good = false
			continue
		}
		row.cells[place] = Cell{text, r.at(i)}
	}
	for i := range row.cells {
		if row.cells[i].Pos.Line == 0 {
			row.cells[i].Pos = row.Pos
		}
	}
	return row, good
}

// room gives the cells of a new row, out of a larger piece: a table has many.
func (t *CSV) room() []Cell {
	n := len(t.Columns)
	if len(t.cells) < n {
		t.cells = make([]Cell, n*min(max(1, len(t.rows)), 64))
	}
	cells := t.cells[:n:n]
	t.cells = t.cells[n:]
	return cells
}

func recordCSVError(file string, content []byte, first int, err error, faults *source.Collector) {
	var e *csv.ParseError
	if !errors.As(err, &e) {
		faults.Add(source.Position{File: file}, "the table cannot be read: %v", err)
		return
	}
	at := source.Position{File: file, Line: e.Line + first - 1, Column: e.Column}
	switch {
	case errors.Is(err, csv.ErrBareQuote):
		faults.Add(at, `a quote (") inside a cell without quotes; quote the whole cell and write "" for a quote in it`)
	case errors.Is(err, csv.ErrQuote):
		at.Line = e.StartLine + first - 1
		if e.StartLine != e.Line {
			at.Column = 0
		} else if open := openQuote(content, e.Line); open > 0 {
			at.Column = open
		}
		faults.Add(at, `a quoted cell does not end, or text follows its closing quote (")`)
	default:
		faults.Add(at, "the row cannot be read: %v", e.Err)
	}
}

// openQuote gives the column of a line at which a quoted cell begins that the
// line does not end; 0 where there is none.
func openQuote(content []byte, line int) int {
	for range line - 1 {
		_, content, _ = bytes.Cut(content, []byte("\n"))
	}
	text, _, _ := bytes.Cut(content, []byte("\n"))
	rest := text
	for {
		rest = bytes.TrimLeftFunc(rest, unicode.IsSpace)
		begin := len(text) - len(rest) + 1
		quoted := bytes.HasPrefix(rest, []byte(`"`))
		for open := quoted; open; {
			end := bytes.IndexByte(rest[1:], '"')
			if end < 0 {
				return begin
			}
			rest = rest[end+2:]
			open = bytes.HasPrefix(rest, []byte(`"`)) // two quotes stand for one
		}
		comma := bytes.IndexByte(rest, ',')
		if comma < 0 || quoted && comma > 0 {
			return 0
		}
		rest = rest[comma+1:]
	}
}
