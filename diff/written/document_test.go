package written_test

import (
	"fmt"
	"maps"
	"slices"
	"strconv"
	"strings"

	"pgregory.net/rapid"

	"speedtrail/schema"
)

// document is what a file says, without the form in which it is written.
type document struct {
	file   string
	tables []*sheet // of a TOML file the first holds the keys of the file itself
}

// sheet is a table: of each row the cells that are not blank, by column. The
// texts of TOML values are quoted.
type sheet struct {
	name string
	rows []map[string]string
}

func (d *document) clone() *document {
	c := &document{file: d.file}
	for _, s := range d.tables {
		n := &sheet{name: s.name}
		for _, row := range s.rows {
			n.rows = append(n.rows, maps.Clone(row))
		}
		c.tables = append(c.tables, n)
	}
	return c
}

// cells writes a document as a sorted list of rows: what two files must have in
// common to hold the same cells.
func (d *document) cells() []string {
	var list []string
	for _, s := range d.tables {
		for _, row := range s.rows {
			if len(row) > 0 { // a TOML file may have no keys outside its tables
				list = append(list, rowText(s.name, row))
			}
		}
	}
	slices.Sort(list)
	return list
}

func rowText(table string, row map[string]string) string {
	text := "[" + table + "]"
	for _, column := range slices.Sorted(maps.Keys(row)) {
		if row[column] != "" {
			text += " " + column + "=" + row[column]
		}
	}
	return text
}

// column is what a cell of a column can hold.
type column struct {
	name   string
	needed bool
	value  *rapid.Generator[string]
}

// kind is a kind of file: its tables with their columns.
type kind struct {
	file   string
	tables map[string][]column
}

func of(values ...string) *rapid.Generator[string] { return rapid.SampledFrom(values) }

func quoted(g *rapid.Generator[string]) *rapid.Generator[string] {
	return rapid.Map(g, strconv.Quote)
}

// Few values make many equal cells. Texts hold what a form could get wrong.
var (
	km    = of("0", "1", "1.0", "1.000000", "2.4", "-3.25", "4", "5", "6.5", "4.5#1", "4.5#2", "10")
	speed = of("40", "80", "100", "160", "")
	words = of("", "n", "a, b", `say "so"`, "# no comment", "x = 1", "[[train]]", "Ärger; ß", "'", "null", "0")
	ids   = of("T1", "T2", "T3")
	// position is one in a TOML file.
	position = of("0", "12.4", "12.40", "31.18", `"31.180#2"`, `"31.180#1"`)
)

// kinds are the files of a data set.
func kinds() []kind {
	csv := func(file string, cells map[string]*rapid.Generator[string], needed ...string) kind {
		var list []column
		for _, name := range schema.TableColumns(file) {
			value := cells[name]
			switch {
			case value != nil:
			case name == "from_km" || name == "to_km" || name == "km":
				value = km
			case name == "note" || name == "reason" || name == "name":
				value = words
			case name == "direction":
				value = of("", "nominal", "reverse", "both")
			case name == "train_length_delay":
				value = of("", "yes", "no")
			case strings.HasSuffix(name, "_rule"):
				value = of("", "limits", "replaces")
			default:
				value = speed
			}
			list = append(list, column{name, slices.Contains(needed, name), value})
		}
		return kind{"routes/r1/" + file, map[string][]column{"": list}}
	}
	type cells = map[string]*rapid.Generator[string]
	number := of("0", "1", "1.0", "2.5", "110", "-3")
	text, id, date := quoted(words), quoted(ids), of("2026-01-01", "2026-01-02", "2027-06-30")
	list := of(`["T1"]`, `["T1", "T2"]`, `["T2", "T1"]`, "[]", `["a, b", "]"]`)
	return []kind{
		csv("speed.csv", nil, "from_km", "to_km"),
		csv("axle-load.csv", nil, "from_km", "to_km"),
		csv("temporary.csv", cells{"id": ids, "valid_from": of("", "2026-01-01"), "valid_to": of("", "2026-01-01", "2026-01-01T06:00:00Z")}, "id", "from_km", "to_km"),
		csv("curves.csv", cells{"radius_m": of("300", "1000"), "cant_mm": of("0", "150"), "hand": of("", "left", "right")}, "from_km", "to_km"),
		csv("gradients.csv", cells{"permille": of("0", "-12.5", "3")}, "from_km", "to_km"),
		csv("places.csv", cells{"kind": of("crossing", "bridge"), "strike_in_m": of("", "900"), "warning_s": of("", "27")}, "km"),
		{"routes/r1/route.toml", map[string][]column{
			"":     {{"id", true, id}, {"name", false, text}, {"start_km", false, position}, {"end_km", false, position}, {"directions", false, of(`["nominal"]`, `["reverse"]`)}},
			"jump": {{"arriving_km", true, position}, {"leaving_km", true, position}},
		}},
		{"trains.toml", map[string][]column{"train": {
			{"id", true, id}, {"name", false, text}, {"cant_deficiency_mm", false, of("150", "80")}, {"categories", false, list}, {"axle_load", false, quoted(of("C2", "D4"))},
			{"length_m", false, number}, {"max_speed_kmh", false, number}, {"acceleration_ms2", false, number}, {"braking_ms2", false, number},
		}}},
		{"dataset.toml", map[string][]column{"": {
			{"format", true, of("1")}, {"name", false, text}, {"time_zone", false, quoted(of("UTC", "Europe/Berlin"))},
			{"limits.cant_excess_mm", false, number}, {"limits.largest_step_kmh", false, number}, {"limits.shortest_stretch_m", false, number},
		}}},
		{"requests/cr-1.toml", map[string][]column{
			"": {{"id", true, id}, {"title", false, text}, {"reason", false, text}},
			"declares": {{"route", true, quoted(of("R1", "R2"))}, {"direction", false, quoted(of("both", "nominal"))}, {"from_km", false, position}, {"to_km", false, position},
				{"effect", false, quoted(of("raise", "lower", "any"))}, {"trains", false, list}},
		}},
		{"accepted.toml", map[string][]column{"accepted": {
			{"finding", true, quoted(of("step-size", "short-stretch"))}, {"route", false, quoted(of("R1"))}, {"from_km", false, position}, {"to_km", false, position}, {"reason", false, text}, {"until", false, date},
		}}},
		{"signoff.toml", map[string][]column{
			"":       {{"format", true, of("1")}},
			"person": {{"principal", true, quoted(of("a", "b", "c"))}, {"emails", false, list}},
			"role":   {{"name", true, quoted(of("check", "approve"))}, {"needed", false, number}, {"independent_of", false, list}, {"signers", false, list}},
		}},
		{"allowed_signers", map[string][]column{"": {
			{"line", true, of("a ssh-ed25519 AAAA1", "a ssh-ed25519 AAAA2", "b ssh-ed25519 AAAA1", `b namespaces="x,y" ssh-ed25519 AAAA3`, "c ssh-ed25519 AAAA4 a comment")},
		}}},
	}
}

// row draws a row.
func (k kind) row(t *rapid.T, table string) map[string]string {
	row := map[string]string{}
	for _, c := range k.tables[table] {
		if !c.needed && rapid.IntRange(0, 2).Draw(t, "given") == 0 {
			continue
		}
		if v := c.value.Draw(t, c.name); v != "" {
			row[c.name] = v
		}
	}
	return row
}

// single tells whether a table has exactly one row: the keys of a TOML file.
func (k kind) single(table string) bool { return table == "" && strings.HasSuffix(k.file, ".toml") }

func (k kind) names() []string { return slices.Sorted(maps.Keys(k.tables)) }

// draw draws a document.
func (k kind) draw(t *rapid.T) *document {
	d := &document{file: k.file}
	for _, name := range k.names() {
		s := &sheet{name: name}
		n := 1
		if !k.single(name) {
			n = rapid.IntRange(0, 6).Draw(t, "rows")
		}
		for range n {
			s.rows = append(s.rows, k.row(t, name))
		}
		d.tables = append(d.tables, s)
	}
	return d
}

// edit makes a document that differs in a few cells and rows, or in none.
func (k kind) edit(t *rapid.T, old *document) *document {
	d := old.clone()
	for range rapid.IntRange(0, 5).Draw(t, "edits") {
		s := rapid.SampledFrom(d.tables).Draw(t, "table")
		columns := k.tables[s.name]
		pick := func() int { return rapid.IntRange(0, len(s.rows)-1).Draw(t, "row") }
		action := rapid.IntRange(0, 5).Draw(t, "action")
		switch {
		case k.single(s.name) || action == 0 && len(s.rows) > 0: // a cell
			i, c := pick(), rapid.SampledFrom(columns).Draw(t, "column")
			if v := c.value.Draw(t, "value"); v != "" {
				s.rows[i][c.name] = v
			} else if !c.needed {
				delete(s.rows[i], c.name)
			}
		case action == 1 && len(s.rows) > 0: // a blank cell
			if c := rapid.SampledFrom(columns).Draw(t, "column"); !c.needed {
				delete(s.rows[pick()], c.name)
			}
		case action == 2 && len(s.rows) > 0:
			i := pick()
			s.rows = slices.Delete(s.rows, i, i+1)
		case action == 3 && len(s.rows) > 0: // a row twice
			s.rows = append(s.rows, maps.Clone(s.rows[pick()]))
		case action == 4 && len(s.rows) > 0: // a row cut in two, or a boundary moved
			i, at := pick(), position.Draw(t, "at")
			if strings.HasSuffix(k.file, ".csv") {
				at = km.Draw(t, "at")
			}
			rest := maps.Clone(s.rows[i])
			for _, c := range columns {
				switch c.name {
				case "to_km":
					s.rows[i]["to_km"] = at
				case "from_km":
					rest["from_km"] = at
				}
			}
			if rapid.Bool().Draw(t, "both parts") {
				s.rows = append(s.rows, rest)
			}
		default:
			s.rows = slices.Insert(s.rows, rapid.IntRange(0, len(s.rows)).Draw(t, "place"), k.row(t, s.name))
		}
	}
	return d
}

// describe writes a document for the report of a failure.
func (d *document) describe() string {
	return fmt.Sprintf("%s\n%s", d.file, strings.Join(d.cells(), "\n"))
}
