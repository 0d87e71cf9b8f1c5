package table

import (
	"bytes"
	"encoding/csv"
	"errors"
	"io"
	"iter"
	"strings"
	"unicode"

	"speedtrail/schema/source"
)

// record is a line of a table, or some where a cell in quotes goes over lines.
type record struct {
	cells  []string // without the blanks around them
	places []place
	file   string
}

// place is where a cell begins.
type place struct{ line, column int }

func (r *record) at(i int) source.Position {
	return source.Position{File: r.file, Line: r.places[i].line, Column: r.places[i].column}
}

// quotedRecords runs over the records of a text of which the first line has a
// number; lines that begin with # are none. An error is about one record, and
// others may follow it. A record is good until the next one.
func quotedRecords(file string, content []byte, first int) iter.Seq2[*record, error] {
	return func(yield func(*record, error) bool) {
		r := csv.NewReader(bytes.NewReader(content))
		r.Comment = '#'
		r.FieldsPerRecord = -1
		r.TrimLeadingSpace = true
		r.ReuseRecord = true
		out := &record{file: file}
		for {
			cells, err := r.Read()
			if errors.Is(err, io.EOF) {
				return
			}
			if err != nil {
				if !yield(nil, err) {
					return
				}
				continue
			}
			out.cells, out.places = out.cells[:0], out.places[:0]
			for i, cell := range cells {
				line, column := r.FieldPos(i)
				out.cells = append(out.cells, strings.TrimSpace(cell))
				out.places = append(out.places, place{line + first - 1, column})
			}
			if !yield(out, nil) {
				return
			}
		}
	}
}

var newline = []byte("\n")

// plainRecords is quotedRecords for a text without quotes, as most are: a comma
// ends a cell and a line ends a record. A history holds thousands of single lines
// to be read, for which a csv.Reader is made for much more than that.
func plainRecords(file string, content []byte, first int) iter.Seq2[*record, error] {
	return func(yield func(*record, error) bool) {
		out := &record{file: file}
		for number := first; len(content) > 0; number++ {
			var line []byte
			line, content, _ = bytes.Cut(content, newline)
			line = bytes.TrimSuffix(line, []byte("\r"))
			if len(line) == 0 || line[0] == '#' {
				continue
			}
			out.split(string(line), number)
			if !yield(out, nil) {
				return
			}
		}
	}
}

// split takes in a line without quotes.
func (r *record) split(line string, number int) {
	r.cells, r.places = r.cells[:0], r.places[:0]
	for rest, more := line, true; more; {
		var cell string
		cell, rest, more = strings.Cut(rest, ",")
		cell = strings.TrimLeftFunc(cell, unicode.IsSpace)
		end := len(line) // of the cell
		if more {
			end -= len(rest) + 1
		}
		r.places = append(r.places, place{number, end - len(cell) + 1})
		r.cells = append(r.cells, strings.TrimSpace(cell))
	}
}
