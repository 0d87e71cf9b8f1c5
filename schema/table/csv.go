package table

import (
	"bytes"
	"encoding/csv"
	"errors"
	"io"
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
	index   map[string]int // column -> place in a row's cells
	rows    []Row
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
func (r Row) Cell(column string) Cell {
	if i, ok := r.table.index[column]; ok {
		return r.cells[i]
	}
	return Cell{Pos: r.Pos}
}

// ReadCSV reads a table: comma separated, RFC 4180 quoting, header row first.
// Columns are found by name, in any order. Lines that begin with # and rows of
// blank cells only are passed over. It always gives a table, with the rows that
// could be read.
func ReadCSV(file string, content []byte, known, required []string, faults *source.Collector) *CSV {
	t := &CSV{index: map[string]int{}}
	at := func(line, column int) source.Position { return source.Position{File: file, Line: line, Column: column} }
	content = bytes.TrimPrefix(content, byteOrderMark)
	if !CheckUTF8(file, content, faults) {
		t.Broken = true
		return t
	}
	if i := bytes.IndexByte(content, 0); i >= 0 {
		faults.Add(at(1+bytes.Count(content[:i], []byte("\n")), i-bytes.LastIndexByte(content[:i], '\n')), "the file holds a NUL byte, it is not text")
		t.Broken = true
		return t
	}
	r := csv.NewReader(bytes.NewReader(content))
	r.Comment = '#'
	r.FieldsPerRecord = -1
	r.TrimLeadingSpace = true
	r.ReuseRecord = true
	var places []int // place in the file's row -> place in Columns, unnamed or unknown
	header := false
	for {
		record, err := r.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			t.Broken = true
			recordCSVError(file, content, err, faults)
			var syntax *csv.ParseError
			if header && errors.As(err, &syntax) {
				continue
			}
			return t // what follows a header that cannot be read is no header
		}
		if !slices.ContainsFunc(record, func(s string) bool { return strings.TrimSpace(s) != "" }) {
			continue
		}
		line, column := r.FieldPos(0)
		if !header {
			header = true
			t.Header = at(line, column)
			places = t.readHeader(record, r, file, known, required, faults)
			if places == nil {
				t.Broken = true
				return t
			}
			continue
		}
		if len(t.rows) == MaxRows {
			faults.Add(at(line, 0), "more than %d rows", MaxRows)
			t.Broken = true
			return t
		}
		if row, ok := t.readRow(record, r, file, places, faults); ok {
			t.rows = append(t.rows, row)
		} else {
			t.Broken = true
		}
	}
	if !header {
		faults.Add(at(1, 0), "no header row, expected %s", strings.Join(known, ","))
		t.Broken = true
	}
	return t
}

// Places of a file's column that is none of CSV.Columns.
const (
	unnamed = -1
	unknown = -2
)

// readHeader finds the columns; nil where the table cannot be read by them.
func (t *CSV) readHeader(record []string, r *csv.Reader, file string, known, required []string, faults *source.Collector) []int {
	at := func(i int) source.Position {
		line, column := r.FieldPos(i)
		return source.Position{File: file, Line: line, Column: column}
	}
	if len(record) > MaxColumns {
		faults.Add(t.Header, "%d columns, at most %d are allowed", len(record), MaxColumns)
		return nil
	}
	if len(record) == 1 && strings.Contains(record[0], ";") {
		faults.Add(t.Header, "columns are separated by semicolons, commas are needed")
		return nil
	}
	places := make([]int, len(record))
	good := true
	for i, cell := range record {
		name := strings.TrimSpace(cell)
		places[i] = unnamed
		switch {
		case name == "":
			if slices.ContainsFunc(record[i:], func(s string) bool { return strings.TrimSpace(s) != "" }) {
				faults.Add(at(i), "column without a name")
				good = false
			}
		case t.Has(name):
			faults.Add(at(i), "column %s stands twice", source.Quote(name))
			good = false
		case !slices.Contains(known, name):
			places[i] = unknown
			faults.Add(at(i), "unknown column %s, known are %s", source.Quote(name), strings.Join(known, ", "))
		default:
			places[i] = len(t.Columns)
			t.index[name] = len(t.Columns)
			t.Columns = append(t.Columns, name)
		}
	}
	for _, name := range required {
		if !t.Has(name) {
			faults.Add(source.Position{File: file, Line: t.Header.Line}, "column %s is missing", name)
			good = false
		}
	}
	if !good {
		return nil
	}
	return places
}

// readRow takes over the cells of a row. A row may be shorter than the header,
// as spreadsheets write it: the cells that are not there are blank.
func (t *CSV) readRow(record []string, r *csv.Reader, file string, places []int, faults *source.Collector) (Row, bool) {
	at := func(i int) source.Position {
		line, column := r.FieldPos(i)
		return source.Position{File: file, Line: line, Column: column}
	}
	row := Row{table: t, Pos: at(0), cells: make([]Cell, len(t.Columns))}
	good := true
	for i := range row.cells {
		row.cells[i].Pos = row.Pos
	}
	if len(record) > MaxColumns {
		faults.Add(row.Pos, "%d cells in a row, at most %d are allowed", len(record), MaxColumns)
		return row, false
	}
	for i, cell := range record {
		text := strings.TrimSpace(cell)
		if i >= len(places) {
			if text != "" {
				faults.Add(at(i), "cell %s has no column in the header; a comma as decimal sign, or in a text without quotes, gives one cell too many", source.Quote(text))
				return row, false
			}
			continue
		}
		if places[i] < 0 {
			if text != "" && places[i] == unnamed {
				faults.Add(at(i), "cell %s stands in a column without a name", source.Quote(text))
				good = false
			}
			continue
		}
		if problem := TextProblem(text); problem != "" {
			faults.Add(at(i), "text %s is %s", source.Quote(text), problem)
			good = false
			continue
		}
		row.cells[places[i]] = Cell{text, at(i)}
	}
	return row, good
}

func recordCSVError(file string, content []byte, err error, faults *source.Collector) {
	var e *csv.ParseError
	if !errors.As(err, &e) {
		faults.Add(source.Position{File: file}, "the table cannot be read: %v", err)
		return
	}
	at := source.Position{File: file, Line: e.Line, Column: e.Column}
	switch {
	case errors.Is(err, csv.ErrBareQuote):
		faults.Add(at, `a quote (") inside a cell without quotes; quote the whole cell and write "" for a quote in it`)
	case errors.Is(err, csv.ErrQuote):
		at.Line = e.StartLine
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
