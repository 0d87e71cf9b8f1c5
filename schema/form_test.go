package schema

import (
	"bytes"
	"encoding/csv"
	"reflect"
	"strings"
	"testing"
	"testing/fstest"

	"pgregory.net/rapid"
)

var mark = []byte("\xEF\xBB\xBF")

// records reads a good table as rows of cells, its header first.
func records(t *rapid.T, content []byte) [][]string {
	r := csv.NewReader(bytes.NewReader(bytes.TrimPrefix(content, mark)))
	r.Comment, r.FieldsPerRecord, r.TrimLeadingSpace = '#', -1, true
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	// The first row that is not blank is the header.
	for i, row := range rows {
		if strings.Join(row, "") != "" {
			return rows[i:]
		}
	}
	t.Fatal("no header")
	return nil
}

// cell writes a cell so that it reads as the text, in one of several ways.
func cell(t *rapid.T, text string, first bool) string {
	quote := rapid.Bool().Draw(t, "quote") || strings.ContainsAny(text, "\",\r\n") || first && strings.HasPrefix(text, "#")
	if !quote {
		blanks := rapid.SampledFrom([]string{"", " ", "\t", "  "})
		return blanks.Draw(t, "before") + text + blanks.Draw(t, "behind")
	}
	blanks := rapid.SampledFrom([]string{"", " "})
	return blanks.Draw(t, "before") + `"` + blanks.Draw(t, "inside") + strings.ReplaceAll(text, `"`, `""`) + blanks.Draw(t, "inside") + `"`
}

// otherwise writes a table in another form with the same meaning: columns in
// another order, comments, blank rows, quoted cells, cells too many that are
// blank, a row's last cells left out where they are blank.
func otherwise(t *rapid.T, content []byte) string {
	rows := records(t, content)
	width := 0
	for i := range rows[0] {
		if strings.TrimSpace(rows[0][i]) != "" {
			width = i + 1
		}
	}
	order := rapid.Permutation(numbers(width)).Draw(t, "columns")
	var b strings.Builder
	for n, row := range rows {
		for range rapid.IntRange(0, 2).Draw(t, "between") {
			b.WriteString(rapid.SampledFrom([]string{"# a comment, with \"quotes\n", "#\n", "\n", ",,\n", " , ,\n", "\"\",\n"}).Draw(t, "line"))
		}
		cells := make([]string, 0, width)
		for i, column := range order {
			text := ""
			if column < len(row) {
				text = strings.TrimSpace(row[column])
			}
			cells = append(cells, cell(t, text, i == 0))
		}
		if rapid.Bool().Draw(t, "short") && n > 0 {
			for len(cells) > 1 && strings.Trim(cells[len(cells)-1], " \t\"") == "" {
				cells = cells[:len(cells)-1]
			}
		}
		for range rapid.IntRange(0, 2).Draw(t, "trailing") {
			cells = append(cells, rapid.SampledFrom([]string{"", " ", `""`}).Draw(t, "blank"))
		}
		b.WriteString(strings.Join(cells, ",") + "\n")
	}
	return b.String()
}

func numbers(n int) []int {
	list := make([]int, n)
	for i := range list {
		list[i] = i
	}
	return list
}

// commented puts comments and blank lines between the lines of a TOML file.
func commented(t *rapid.T, content string) string {
	var b strings.Builder
	for line := range strings.Lines(content) {
		if rapid.IntRange(0, 3).Draw(t, "comment") == 0 && !strings.Contains(content, `"""`) {
			b.WriteString(rapid.SampledFrom([]string{"# why\n", "\n", "  # [table]\n"}).Draw(t, "line"))
		}
		b.WriteString(line)
	}
	return b.String()
}

// TestForm: columns in another order, comments, blank lines, CRLF, a byte order
// mark and quotes alter nothing of a data set but positions.
func TestForm(t *testing.T) {
	for _, name := range datasetNames(t) {
		t.Run(name, func(t *testing.T) {
			files := open(t, name)
			want := plain(load(t, files))
			rapid.Check(t, func(t *rapid.T) {
				altered := fstest.MapFS{}
				for p, f := range files {
					altered[p] = &fstest.MapFile{Data: alter(t, p, f.Data)}
				}
				got, err := Load(t.Context(), altered)
				if err != nil {
					t.Fatal(err)
				}
				if !reflect.DeepEqual(plain(got), want) {
					t.Fatalf("another data set: %+v, want %+v", plain(got), want)
				}
			})
		})
	}
}

func alter(t *rapid.T, name string, content []byte) []byte {
	text := ""
	switch {
	case strings.HasSuffix(name, ".csv"):
		text = otherwise(t, content)
	case strings.HasSuffix(name, ".toml"):
		text = commented(t, string(bytes.TrimPrefix(content, mark)))
	case name == signersFile:
		text = "# keys\n\n" + string(content)
	default:
		return content
	}
	text = strings.ReplaceAll(text, "\r\n", "\n")
	if rapid.Bool().Draw(t, "crlf") {
		text = strings.ReplaceAll(text, "\n", "\r\n")
	}
	if rapid.Bool().Draw(t, "mark") && name != signersFile {
		text = string(mark) + text
	}
	if rapid.Bool().Draw(t, "no last line end") {
		text = strings.TrimRight(text, "\r\n")
	}
	return []byte(text)
}

// TestFormSpeedOrder: the rows of a table may stand in any order; the loaded
// rows stand in the order of the file.
func TestFormSpeedOrder(t *testing.T) {
	files := open(t, "realigned")
	const name = "routes/r/speed.csv"
	rows := load(t, files).Routes[0].Speed
	lines := strings.Split(strings.TrimSpace(string(files[name].Data)), "\n")
	rapid.Check(t, func(t *rapid.T) {
		order := rapid.Permutation(numbers(len(rows))).Draw(t, "order")
		shuffled := []string{lines[0]}
		for _, i := range order {
			shuffled = append(shuffled, lines[i+1])
		}
		d, err := Load(t.Context(), with(files, name, strings.Join(shuffled, "\n")))
		if err != nil {
			t.Fatal(err)
		}
		for k, i := range order {
			got, want := d.Routes[0].Speed[k], rows[i]
			if got.Pos.Line != k+2 {
				t.Errorf("row %d stands at %v", k, got.Pos)
			}
			got.Pos = want.Pos
			if got != want {
				t.Errorf("row %d: %+v, want %+v", k, got, want)
			}
		}
	})
}
