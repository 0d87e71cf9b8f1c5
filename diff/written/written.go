// Package written turns the files of a data set into tables of cells as they
// are written, so that two revisions of a file can be accounted for cell by
// cell, with nothing left out that is data.
//
// A CSV file is one table. A TOML file is one table of its keys, a row of one
// each, and a table for each array of tables, such as [[train]]. The file
// allowed_signers is a table of its lines. Comments, blank lines, the order of
// columns and rows and the form of line ends are not cells.
//
//	for _, t := range written.Pair("routes/r1/speed.csv", old, now, oldTrack, nowTrack) {
//		rows.Compare(&t.Old, &t.New)
//	}
package written

import (
	"bytes"
	"path"
	"slices"
	"strconv"
	"strings"

	"speedtrail/diff/rows"
	"speedtrail/schema"
	"speedtrail/schema/chainage"
	"speedtrail/schema/source"
	"speedtrail/schema/table"
)

// Texts are the columns and keys that only people read.
var Texts = []string{"note", "reason", "name", "id"}

// Table is the same table of a file in two revisions.
type Table struct {
	Name     string // of an array of tables, as "train"; else empty
	Old, New rows.Table
}

// Pair gives the tables of two revisions of a file; nil stands for a file that
// one of them does not have. The content must have been read without fault. The
// tracks are those of the file's route, nil for other files.
func Pair(name string, old, now []byte, oldTrack, nowTrack *chainage.Track) []Table {
	switch base := path.Base(name); {
	case strings.HasSuffix(base, ".toml"):
		return tomlPair(name, old, now)
	case strings.HasSuffix(base, ".csv"):
		columns := schema.TableColumns(base)
		from := slices.Index(columns, "from_km")
		if from < 0 {
			from = slices.Index(columns, "km")
		}
		to := slices.Index(columns, "to_km")
		side := func(content []byte, track *chainage.Track) rows.Table {
			return rows.Table{Columns: columns, FromColumn: from, ToColumn: to, Rows: csvRows(name, content, columns, from, track)}
		}
		return []Table{{Old: side(old, oldTrack), New: side(now, nowTrack)}}
	default:
		side := func(content []byte) rows.Table {
			return rows.Table{Columns: []string{"line"}, FromColumn: -1, ToColumn: -1, Rows: lineRows(content)}
		}
		return []Table{{Old: side(old), New: side(now)}}
	}
}

// csvRows reads the rows of a table.
func csvRows(name string, content []byte, columns []string, from int, track *chainage.Track) []rows.Row {
	if content == nil {
		return nil
	}
	var faults source.Collector
	t := table.ReadCSV(name, content, columns, nil, &faults)
	list := make([]rows.Row, 0, t.Len())
	for line := range t.Rows() {
		row := rows.Row{Line: line.Pos.Line, Cells: make([]string, len(columns))}
		for i, c := range columns {
			row.Cells[i] = line.Cell(c).Text
			switch {
			case c == "from_km" || c == "km":
				row.From = point(row.Cells[i])
			case c == "to_km":
				row.To = point(row.Cells[i])
			case path.Base(name) == "temporary.csv" && c == "id", path.Base(name) == "places.csv" && c == "name":
				row.Name = row.Cells[i]
			}
		}
		row.Start = row.From.Chainage
		if track != nil && from >= 0 {
			// As it is written: a first occurrence is marked where posts repeat.
			if p, err := chainage.ParsePoint(row.Cells[from]); err == nil {
				if s, err := track.Locate(p); err == nil {
					row.Start = s
				}
			}
		}
		list = append(list, row)
	}
	return list
}

// point reads a position as one that rows can be matched by: the first
// occurrence is the bare one.
func point(text string) chainage.Point {
	p, err := chainage.ParsePoint(text)
	if err != nil {
		return chainage.Point{}
	}
	return p.Plain()
}

// lineRows takes the lines of a text that are not blank or comments.
func lineRows(content []byte) []rows.Row {
	var list []rows.Row
	for i, line := range strings.Split(string(bytes.TrimPrefix(content, []byte("\xEF\xBB\xBF"))), "\n") {
		line = strings.TrimSpace(line)
		if line == "" || line[0] == '#' {
			continue
		}
		name, _, _ := strings.Cut(line, " ")
		list = append(list, rows.Row{Line: i + 1, Name: name, Cells: []string{line}})
	}
	return list
}

// SameValue tells whether two cells of a column are written differently and mean the
// same: numbers with other zeros, a first occurrence with and without its mark.
// Texts mean what they are: the train "7" is another one than "7.0".
func SameValue(column, a, b string) bool {
	if a == b {
		return true
	}
	if isText(column, a) || isText(column, b) {
		return false
	}
	p, errA := chainage.ParsePoint(strings.Trim(a, `"`))
	q, errB := chainage.ParsePoint(strings.Trim(b, `"`))
	if errA != nil || errB != nil {
		return false
	}
	return p.Plain() == q.Plain()
}

// isText tells whether a cell is a text that may look like a number. In TOML all
// that is quoted is one, but for positions.
func isText(column, cell string) bool {
	return slices.Contains(Texts, column) || strings.HasPrefix(cell, `"`) && !strings.HasSuffix(column, "_km")
}

// tomlPair gives the tables of a TOML file.
func tomlPair(name string, old, now []byte) []Table {
	sides := [2]*flat{flatten(name, old), flatten(name, now)}
	var list []Table
	for _, t := range append(slices.Clone(sides[0].names), sides[1].names...) {
		if slices.ContainsFunc(list, func(x Table) bool { return x.Name == t }) {
			continue
		}
		// Both sides have the columns of either.
		var columns []string
		for _, side := range sides {
			for _, element := range side.tables[t] {
				for _, e := range element {
					if !slices.Contains(columns, e.key) {
						columns = append(columns, e.key)
					}
				}
			}
		}
		slices.Sort(columns)
		out := Table{Name: t}
		for i, side := range sides {
			r := rows.Table{Columns: columns, FromColumn: slices.Index(columns, "from_km"), ToColumn: slices.Index(columns, "to_km")}
			for _, element := range side.tables[t] {
				if len(element) > 0 {
					r.Rows = append(r.Rows, tomlRow(t, columns, element))
				}
			}
			if i == 0 {
				out.Old = r
			} else {
				out.New = r
			}
		}
		list = append(list, out)
	}
	return list
}

// tomlRow makes a row of the keys of a table.
func tomlRow(name string, columns []string, element []entry) rows.Row {
	row := rows.Row{Cells: make([]string, len(columns))}
	if name == "" {
		row.Name = "keys"
	}
	for _, e := range element {
		row.Cells[slices.Index(columns, e.key)] = e.value
		if row.Line == 0 || e.line < row.Line {
			row.Line = e.line
		}
		text := strings.Trim(e.value, `"`)
		switch e.key {
		case "id", "principal", "name":
			if e.key != "name" || row.Name == "" {
				row.Name = text
			}
		case "from_km", "arriving_km":
			row.From = point(text)
			row.Start = row.From.Chainage
		case "to_km", "leaving_km":
			row.To = point(text)
		}
	}
	return row
}

// entry is a key of a TOML table with its value as it is written.
type entry struct {
	key, value string
	line       int
}

// flat is a TOML file as tables: "" holds the keys of the file, those of inner
// tables with the table's name in front.
type flat struct {
	names  []string
	tables map[string][][]entry
}

func flatten(name string, content []byte) *flat {
	f := &flat{tables: map[string][][]entry{}}
	if content == nil {
		return f
	}
	var faults source.Collector
	if top := table.ReadTOML(name, content, &faults); top != nil {
		f.names = []string{""}
		f.tables[""] = [][]entry{f.element("", top)}
	}
	return f
}

// element lists the keys of a table; arrays of tables become tables of their
// own.
func (f *flat) element(prefix string, m *table.Map) []entry {
	var list []entry
	for _, key := range m.Keys() {
		v := m.Get(key)
		switch {
		case v.Kind == table.TableKind:
			list = append(list, f.element(prefix+key+".", v.Table)...)
		case v.Kind == table.ArrayKind && len(v.Items) > 0 && v.Items[0].Kind == table.TableKind:
			name := prefix + key
			if f.tables[name] == nil {
				f.names = append(f.names, name)
			}
			for i := range v.Items {
				if v.Items[i].Kind == table.TableKind {
					f.tables[name] = append(f.tables[name], f.element("", v.Items[i].Table))
				}
			}
		default:
			list = append(list, entry{prefix + key, valueText(v), m.Place(key).Line})
		}
	}
	return list
}

// valueText writes a value so that different values have different texts.
func valueText(v *table.Value) string {
	switch v.Kind {
	case table.StringKind:
		return strconv.Quote(v.Text)
	case table.ArrayKind:
		parts := make([]string, len(v.Items))
		for i := range v.Items {
			parts[i] = valueText(&v.Items[i])
		}
		return "[" + strings.Join(parts, ", ") + "]"
	case table.TableKind:
		var parts []string
		for _, key := range v.Table.Keys() {
			parts = append(parts, key+" = "+valueText(v.Table.Get(key)))
		}
		return "{" + strings.Join(parts, ", ") + "}"
	}
	return v.Text
}
