package written_test

import (
	"maps"
	"slices"
	"strconv"
	"strings"

	"pgregory.net/rapid"

	"speedtrail/schema"
)

// write writes a document in some form: byte order mark, line ends, comments,
// blank lines, the order of columns, keys and rows, quotes. None of it says
// anything.
func (d *document) write(t *rapid.T) []byte {
	var lines []string
	switch {
	case strings.HasSuffix(d.file, ".csv"):
		lines = d.csv(t)
	case strings.HasSuffix(d.file, ".toml"):
		lines = d.toml(t)
	default:
		for _, row := range shuffled(t, d.tables[0].rows) {
			lines = append(lines, blanks(t)+row["line"]+blanks(t))
		}
	}
	var text []string
	for _, line := range lines {
		switch rapid.IntRange(0, 9).Draw(t, "between") {
		case 0:
			text = append(text, "# a comment, \"with\" [[what]] = looks like data")
		case 1:
			text = append(text, "")
		}
		text = append(text, line)
	}
	end := rapid.SampledFrom([]string{"\n", "\r\n"}).Draw(t, "line end")
	out := strings.Join(text, end)
	if rapid.Bool().Draw(t, "last line end") {
		out += end
	}
	if rapid.IntRange(0, 3).Draw(t, "mark") == 0 {
		out = "\xEF\xBB\xBF" + out
	}
	return []byte(out)
}

func blanks(t *rapid.T) string {
	return rapid.SampledFrom([]string{"", "", " ", "\t"}).Draw(t, "blanks")
}

func shuffled[T any](t *rapid.T, list []T) []T {
	if len(list) < 2 || rapid.Bool().Draw(t, "in order") {
		return list
	}
	return rapid.Permutation(list).Draw(t, "order")
}

// csv writes the lines of a table.
func (d *document) csv(t *rapid.T) []string {
	var columns []string
	for _, c := range schema.TableColumns(d.file[strings.LastIndexByte(d.file, '/')+1:]) {
		used := slices.ContainsFunc(d.tables[0].rows, func(row map[string]string) bool { return row[c] != "" })
		if used || rapid.IntRange(0, 3).Draw(t, "blank column") == 0 {
			columns = append(columns, c)
		}
	}
	if len(columns) == 0 {
		columns = []string{"note"}
	}
	columns = shuffled(t, columns)
	spare := rapid.IntRange(0, 5).Draw(t, "spare commas") == 0
	line := func(cells []string) string {
		text := strings.Join(cells, ",")
		if spare {
			text += ",,"
		}
		return text
	}
	lines := []string{line(columns)}
	for _, row := range shuffled(t, d.tables[0].rows) {
		cells := make([]string, len(columns))
		for i, c := range columns {
			v := row[c]
			if strings.ContainsAny(v, `",`) || strings.HasPrefix(v, "#") || rapid.IntRange(0, 5).Draw(t, "quotes") == 0 {
				v = `"` + strings.ReplaceAll(v, `"`, `""`) + `"`
			} else {
				v = blanks(t) + v + blanks(t)
			}
			cells[i] = v
		}
		lines = append(lines, line(cells))
		if rapid.IntRange(0, 9).Draw(t, "blank row") == 0 {
			lines = append(lines, strings.Repeat(",", len(columns)-1))
		}
	}
	return lines
}

// toml writes the lines of a TOML file: its keys, those of inner tables, then
// the arrays of tables, whose elements may stand mixed with those of others.
func (d *document) toml(t *rapid.T) []string {
	var lines, inner []string
	var heads [][]string
	for _, s := range d.tables {
		for _, row := range shuffled(t, s.rows) {
			var block []string
			if s.name != "" {
				block = append(block, "[["+blanks(t)+s.name+blanks(t)+"]]")
			}
			dotted := rapid.Bool().Draw(t, "dotted")
			for _, key := range shuffled(t, slices.Sorted(maps.Keys(row))) {
				text := blanks(t) + "=" + blanks(t) + value(t, row[key]) + rapid.SampledFrom([]string{"", " # why"}).Draw(t, "tail")
				if table, name, ok := strings.Cut(key, "."); ok && !dotted {
					if inner == nil {
						inner = append(inner, "["+table+"]")
					}
					inner = append(inner, name+text)
					continue
				}
				block = append(block, key+text)
			}
			if s.name == "" {
				lines = append(lines, block...)
			} else {
				heads = append(heads, block)
			}
		}
	}
	lines = append(lines, inner...)
	for _, block := range shuffled(t, heads) {
		lines = append(lines, block...)
	}
	return lines
}

// value writes a TOML value in one of its forms.
func value(t *rapid.T, v string) string {
	switch {
	case strings.HasPrefix(v, `"`):
		text, err := strconv.Unquote(v)
		if err != nil {
			panic(err)
		}
		switch form := rapid.IntRange(0, 2).Draw(t, "form"); {
		case form == 1 && !strings.ContainsAny(text, "'"):
			return "'" + text + "'"
		case form == 2 && text != "":
			return `"\u` + strings.ToUpper(strconv.FormatInt(0x10000+int64([]rune(text)[0]), 16)[1:]) + strings.TrimPrefix(strconv.Quote(string([]rune(text)[1:])), `"`)
		}
		return v
	case strings.HasPrefix(v, "[") && v != "[]" && rapid.Bool().Draw(t, "many lines"):
		return "[ # first\n\t" + v[1:len(v)-1] + ", # last\n]"
	}
	return v
}
