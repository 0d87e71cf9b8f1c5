package table

import (
	"bytes"
	"fmt"
	"iter"
	"slices"
	"strings"
	"testing"

	"speedtrail/schema/source"
)

var known = []string{"from_km", "to_km", "basic", "note"}

// dump writes the rows of a table with the place of every cell.
func dump(t *CSV) string {
	var b strings.Builder
	for row := range t.Rows() {
		fmt.Fprintf(&b, "%d:%d", row.Pos.Line, row.Pos.Column)
		for _, column := range t.Columns {
			c := row.Cell(column)
			fmt.Fprintf(&b, " %s=%q@%d:%d", column, c.Text, c.Pos.Line, c.Pos.Column)
		}
		b.WriteString("\n")
	}
	return b.String()
}

func faultText(c *source.Collector) string {
	if err := c.Err(); err != nil {
		return err.Error()
	}
	return ""
}

func TestReadCSV(t *testing.T) {
	tests := []struct{ name, content, columns, want string }{
		{"plain", "from_km,to_km\n0,1\n1,2\n", "from_km,to_km", "2:1 from_km=\"0\"@2:1 to_km=\"1\"@2:3\n3:1 from_km=\"1\"@3:1 to_km=\"2\"@3:3\n"},
		{"no last line end", "from_km,to_km\n0,1", "from_km,to_km", "2:1 from_km=\"0\"@2:1 to_km=\"1\"@2:3\n"},
		{"CRLF", "from_km,to_km\r\n0,1\r\n\r\n1,2\r\n", "from_km,to_km", "2:1 from_km=\"0\"@2:1 to_km=\"1\"@2:3\n4:1 from_km=\"1\"@4:1 to_km=\"2\"@4:3\n"},
		{"byte order mark", "\ufefffrom_km,to_km\n0,1\n", "from_km,to_km", "2:1 from_km=\"0\"@2:1 to_km=\"1\"@2:3\n"},
		{"byte order mark before a comment", "\ufeff# why\nfrom_km,to_km\n0,1\n", "from_km,to_km", "3:1 from_km=\"0\"@3:1 to_km=\"1\"@3:3\n"},
		{"other order", "note,to_km,from_km\nx,1,0\n", "note,to_km,from_km", "2:1 note=\"x\"@2:1 to_km=\"1\"@2:3 from_km=\"0\"@2:5\n"},
		{"comments and blank rows", "\n# one\nfrom_km,to_km\n#2,3\n,\n  , \n\n0,1\n# end", "from_km,to_km", "8:1 from_km=\"0\"@8:1 to_km=\"1\"@8:3\n"},
		{"blanks around cells", " from_km ,\tto_km\n  0 , 1\t\n", "from_km,to_km", "2:3 from_km=\"0\"@2:3 to_km=\"1\"@2:7\n"},
		{"no-break blanks of a spreadsheet", "from_km,to_km\n\u00a00\u00a0,1\n", "from_km,to_km", "2:3 from_km=\"0\"@2:3 to_km=\"1\"@2:7\n"},
		{"quotes", "\"from_km\",to_km,note\n\"0\", \"1\",\"a, \"\"b\"\"\"\n", "from_km,to_km,note", "2:1 from_km=\"0\"@2:1 to_km=\"1\"@2:6 note=\"a, \\\"b\\\"\"@2:10\n"},
		{"quoted sign of a comment", "note,from_km,to_km\n\"# no comment\",0,1\n", "note,from_km,to_km", "2:1 note=\"# no comment\"@2:1 from_km=\"0\"@2:16 to_km=\"1\"@2:18\n"},
		{"sign of a comment behind a blank", "note,from_km,to_km\n # no comment,0,1\n", "note,from_km,to_km", "2:2 note=\"# no comment\"@2:2 from_km=\"0\"@2:15 to_km=\"1\"@2:17\n"},
		{"short row", "from_km,to_km,note\n0,1\n", "from_km,to_km,note", "2:1 from_km=\"0\"@2:1 to_km=\"1\"@2:3 note=\"\"@2:1\n"},
		{"trailing commas", "from_km,to_km,, ,\n0,1,,,\n0,1,,,,,,\n", "from_km,to_km", "2:1 from_km=\"0\"@2:1 to_km=\"1\"@2:3\n3:1 from_km=\"0\"@3:1 to_km=\"1\"@3:3\n"},
		{"columns count bytes", "note,from_km,to_km\nÄÖ,0,1\n", "note,from_km,to_km", "2:1 note=\"ÄÖ\"@2:1 from_km=\"0\"@2:6 to_km=\"1\"@2:8\n"},
		{"header only", "from_km,to_km\n", "from_km,to_km", ""},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			var faults source.Collector
			table := ReadCSV("t.csv", []byte(c.content), known, []string{"from_km", "to_km"}, &faults)
			if faults.Count() > 0 || table.Broken {
				t.Fatalf("broken %v: %s", table.Broken, faultText(&faults))
			}
			if got := strings.Join(table.Columns, ","); got != c.columns {
				t.Errorf("columns %s, want %s", got, c.columns)
			}
			if got := dump(table); got != c.want {
				t.Errorf("got\n%swant\n%s", got, c.want)
			}
			if table.Len() != strings.Count(c.want, "\n") || table.Has("basic") || !table.Has("to_km") {
				t.Errorf("%d rows, basic %v", table.Len(), table.Has("basic"))
			}
			for row := range table.Rows() {
				if cell := row.Cell("basic"); cell.Text != "" || cell.Pos != row.Pos {
					t.Errorf("a column that is not there: %+v", cell)
				}
			}
		})
	}
}

func TestReadCSVFaults(t *testing.T) {
	const names = "known are from_km, to_km, basic, note"
	wide := strings.Repeat(",x", MaxColumns)
	tests := []struct{ name, content, want string }{
		{"empty", "", "t.csv:1: no header row, expected from_km,to_km,basic,note"},
		{"comments only", "# a\n\n#b", "t.csv:1: no header row, expected from_km,to_km,basic,note"},
		{"blank cells only", ",,\n,,\n", "t.csv:1: no header row, expected from_km,to_km,basic,note"},
		{"required", "# why\n\nnote\n", "t.csv:3: column from_km is missing\nt.csv:3: column to_km is missing"},
		{"unknown", "from_km,to_km,Basic\n0,1,x\n", `t.csv:1:15: unknown column "Basic", ` + names},
		{"twice", "from_km,to_km,from_km\n0,1,0\n", `t.csv:1:15: column "from_km" stands twice`},
		{"unnamed", "from_km,,to_km\n0,,1\n", "t.csv:1:9: column without a name"},
		{"cell of an unnamed column", "from_km,to_km,\n0,1, x\n", `t.csv:2:6: cell "x" stands in a column without a name`},
		{"cell too many", "from_km,to_km\n0,1,,x\n", `t.csv:2:6: cell "x" has no column in the header; a comma as decimal sign, or in a text without quotes, gives one cell too many`},
		{"columns too many", "from_km,to_km" + wide + "\n", "t.csv:1:1: 66 columns, at most 64 are allowed"},
		{"cells too many", "from_km,to_km\n0,1" + wide + "\n", "t.csv:2:1: 66 cells in a row, at most 64 are allowed"},
		{"semicolons", "from_km;to_km\n0;1\n", "t.csv:1:1: columns are separated by semicolons, commas are needed"},
		{"not UTF-8", "from_km,to_km,note\n0,1,\xe9\n1,2,ok\n2,3,\xff\n", "t.csv:2:5: byte 0xe9 is not valid UTF-8, save the file as UTF-8\nt.csv:4:5: byte 0xff is not valid UTF-8, save the file as UTF-8"},
		{"not UTF-8 behind letters that are", "from_km,to_km,note\n0,1,ö日\xe9\n", "t.csv:2:10: byte 0xe9 is not valid UTF-8, save the file as UTF-8"},
		{"half a letter", "from_km,to_km,note\n0,1,\xe2\x82", "t.csv:2:5: byte 0xe2 is not valid UTF-8, save the file as UTF-8"},
		{"NUL", "from_km,to_km\n0,1\n\x00", "t.csv:3:1: the file holds a NUL byte, it is not text"},
		{"NUL and CRLF", "from_km,to_km\r\n0,\x001\r\n", "t.csv:2:3: the file holds a NUL byte, it is not text"},
		{"two byte order marks", "\ufeff\ufefffrom_km,to_km\n", "t.csv:1: column from_km is missing\nt.csv:1:1: unknown column \"\\ufefffrom_km\", " + names},
		{"header with a bare quote", "from_km,to_km,no\"te\n0,1,\n", `t.csv:1:17: a quote (") inside a cell without quotes; quote the whole cell and write "" for a quote in it`},
		{"bare quote", "from_km,to_km,note\n0,1,5\" deep\n1,2,\n", `t.csv:2:6: a quote (") inside a cell without quotes; quote the whole cell and write "" for a quote in it`},
		{"open quote", "from_km,to_km,note\n0,1,\"a\n1,2,\n", `t.csv:2: a quoted cell does not end, or text follows its closing quote (")`},
		{"text behind a quote", "from_km,to_km,note\n0,1,\"a\"b\n1,2,\n", `t.csv:2:7: a quoted cell does not end, or text follows its closing quote (")`},
		{"control code", "from_km,to_km,note\n0,1,a\x1bb\n", `t.csv:2:5: text "a\x1bb" is holding a control code, only visible characters are allowed`},
		{"line end in a cell", "from_km,to_km,note\r\n0,1,\"a\r\nb\"\r\n", `t.csv:2:5: text "a\nb" is holding a control code, only visible characters are allowed`},
		{"long cell", "from_km,to_km,note\n0,1," + strings.Repeat("x", MaxCell+1) + "\n", `t.csv:2:5: text "` + strings.Repeat("x", 80) + `"... is longer than 4096 bytes`},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			var faults source.Collector
			table := ReadCSV("t.csv", []byte(c.content), known, []string{"from_km", "to_km"}, &faults)
			if got := faultText(&faults); got != c.want {
				t.Errorf("got\n%s\nwant\n%s", got, c.want)
			}
			if !table.Broken && c.name != "unknown" {
				t.Error("the table is not broken")
			}
		})
	}
}

// A quoted cell that the last line does not end is told where it begins; text
// behind a closing quote, at that quote.
func TestReadCSVOpenQuoteInLastLine(t *testing.T) {
	for line, column := range map[string]int{
		`0,"open`:                        3,
		"0,\"open\n":                     3,
		"0,\"open\r\n":                   3,
		`"open, "" to the end`:           1,
		`"0", "Ä "" Ö","open ""`:         17,
		"0,\t\"open":                     4,
		`0,"`:                            3,
		`0,"a"b,"open`:                   5,
		`0,"a" ,"open`:                   5,
		`0,,,"a ""b"" c",  "open, ""b""`: 19,
	} {
		var faults source.Collector
		ReadCSV("t.csv", []byte("from_km,note,,,\n"+line), known, nil, &faults)
		want := fmt.Sprintf(`t.csv:2:%d: a quoted cell does not end, or text follows its closing quote (")`, column)
		if got := faultText(&faults); got != want {
			t.Errorf("%q: got %s, want %s", line, got, want)
		}
	}
}

// Rows that can be read are given beside those that cannot.
func TestReadCSVGoesOn(t *testing.T) {
	var faults source.Collector
	table := ReadCSV("t.csv", []byte("from_km,to_km,note\n0,1,a\"\n1,2,ok\n2,3,\"x\"y\n3,4,a,b\n4,5,\x07\n5,6,end\n"), known, nil, &faults)
	var lines []int
	for row := range table.Rows() {
		lines = append(lines, row.Pos.Line)
	}
	if !slices.Equal(lines, []int{3, 7}) || faults.Count() != 4 || !table.Broken {
		t.Errorf("rows of the lines %v, %s", lines, faultText(&faults))
	}
}

func TestReadCSVBounds(t *testing.T) {
	var b strings.Builder
	b.WriteString("from_km,to_km\n")
	for range MaxRows {
		b.WriteString("0,1\n")
	}
	var faults source.Collector
	if table := ReadCSV("t.csv", []byte(b.String()), known, nil, &faults); table.Len() != MaxRows || table.Broken || faults.Count() > 0 {
		t.Errorf("%d rows, %s", table.Len(), faultText(&faults))
	}
	b.WriteString("0,1\n0,1\n")
	table := ReadCSV("t.csv", []byte(b.String()), known, nil, &faults)
	if got, want := faultText(&faults), "t.csv:200002: more than 200000 rows"; got != want || table.Len() != MaxRows || !table.Broken {
		t.Errorf("%d rows, %s, want %s", table.Len(), got, want)
	}
	// Of a file in another encoding only the first lines are told.
	faults = source.Collector{}
	ReadCSV("t.csv", []byte(strings.Repeat("\xff\n", 100)), known, nil, &faults)
	if faults.Count() != 20 {
		t.Errorf("%d faults of 100 lines", faults.Count())
	}
}

func TestTextProblem(t *testing.T) {
	for text, want := range map[string]string{
		"":                                   "",
		"Ørvik – 日本, \"x\"":                  "",
		strings.Repeat("x", MaxCell):         "",
		strings.Repeat("x", MaxCell+1):       "longer than 4096 bytes",
		strings.Repeat("é", MaxCell/2):       "",
		strings.Repeat("é", MaxCell/2) + "x": "longer than 4096 bytes",
		"a\x00":                              "holding a control code, only visible characters are allowed",
		"a\tb":                               "holding a control code, only visible characters are allowed",
		"a\u0085":                            "holding a control code, only visible characters are allowed",
		"a\x7f":                              "holding a control code, only visible characters are allowed",
		"\u202d":                             "holding an invisible mark that can deceive a reader, only visible characters are allowed",
		"\u2066":                             "holding an invisible mark that can deceive a reader, only visible characters are allowed",
		"\u200e":                             "holding an invisible mark that can deceive a reader, only visible characters are allowed",
		"\u061c":                             "holding an invisible mark that can deceive a reader, only visible characters are allowed",
		"\u2029":                             "holding an invisible mark that can deceive a reader, only visible characters are allowed",
		"\ufeff":                             "holding an invisible mark that can deceive a reader, only visible characters are allowed",
	} {
		if got := TextProblem(text); got != want {
			t.Errorf("TextProblem(%.20q) = %q, want %q", text, got, want)
		}
	}
	// All of these read as EXP-3.
	for _, hidden := range "\u00ad\u180e\u200b\u200c\u200d\u200e\u2028\u2060\u2061\u2062\u2063\u2064\ufeff\U000e0000\U000e0001\U000e0041\U000e007f" {
		text := "EXP" + string(hidden) + "-3"
		if got, want := TextProblem(text), "holding an invisible mark that can deceive a reader, only visible characters are allowed"; got != want {
			t.Errorf("TextProblem(%+q) = %q, want %q", text, got, want)
		}
	}
	// Variation selectors belong to signs that people write.
	if got := TextProblem("crossing \u26a0\ufe0f"); got != "" {
		t.Errorf("a sign with its variation selector: %s", got)
	}
}

func records(read func(string, []byte, int) iter.Seq2[*record, error], content []byte) string {
	var b strings.Builder
	for r, err := range read("t.csv", content, 7) {
		if err != nil {
			fmt.Fprintln(&b, err)
			continue
		}
		fmt.Fprintf(&b, "%q %v\n", r.cells, r.places)
	}
	return b.String()
}

func FuzzReadCSV(f *testing.F) {
	for _, s := range []string{"from_km,to_km\n0,1\n", "\ufeff# why\r\nnote,from_km\r\n\"a, \"\"b\"\"\",0\r\n", "from_km,,\n0,1,\n", "a;b\n", "from_km\n\"open\n", "from_km\n0\x00\n",
		"from_km,note\n  0,\"x\"y\n,,,\n1,\xff\n", "\n\n#\nfrom_km\r1\r"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, content []byte) {
		var faults, again source.Collector
		table := ReadCSV("t.csv", content, known, []string{"from_km"}, &faults)
		if second := ReadCSV("t.csv", content, known, []string{"from_km"}, &again); dump(second) != dump(table) || faultText(&again) != faultText(&faults) {
			t.Fatal("read twice, two results")
		}
		if !bytes.Contains(content, []byte(`"`)) {
			if plain, quoted := records(plainRecords, content), records(quotedRecords, content); plain != quoted {
				t.Fatalf("without quotes:\n%s\nas encoding/csv has it:\n%s", plain, quoted)
			}
		}
		if faults.Count() == 0 && !table.Has("from_km") {
			t.Fatal("a required column is missing and not told")
		}
		if table.Broken && faults.Count() == 0 {
			t.Fatal("broken without a fault")
		}
		lines := strings.Split(strings.TrimPrefix(string(content), "\ufeff"), "\n")
		if list, ok := faults.Err().(*source.Faults); ok {
			for _, fault := range list.List {
				if fault.Line > len(lines) || fault.Line > 0 && fault.Column > len(lines[fault.Line-1])+1 {
					t.Fatalf("%v stands outside the file", fault)
				}
			}
		}
		last := 0
		for row := range table.Rows() {
			if row.Pos.Line <= last {
				t.Fatalf("row of line %d behind line %d", row.Pos.Line, last)
			}
			last = row.Pos.Line
			for _, column := range table.Columns {
				c := row.Cell(column)
				if c.Text != strings.TrimSpace(c.Text) || TextProblem(c.Text) != "" {
					t.Fatalf("cell %q", c.Text)
				}
				// A cell is what stands at its place, but for quotes.
				if there := lines[c.Pos.Line-1][c.Pos.Column-1:]; !strings.HasPrefix(there, `"`) && !strings.HasPrefix(there, c.Text) {
					t.Fatalf("cell %q at %v, where %q stands", c.Text, c.Pos, there)
				}
			}
		}
	})
}
