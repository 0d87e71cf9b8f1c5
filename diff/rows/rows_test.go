package rows

import (
	"fmt"
	"maps"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/schema/chainage"
	"speedtrail/schema/unit"
)

// tableOf reads rows "name from to basic note", a dot for a blank cell.
func tableOf(text ...string) *Table {
	t := &Table{Columns: []string{"id", "from_km", "to_km", "basic", "note"}, FromColumn: 1, ToColumn: 2}
	for i, line := range text {
		cells := strings.Fields(line)
		for k := range cells {
			if cells[k] == "." {
				cells[k] = ""
			}
		}
		from, _ := chainage.ParsePoint(cells[1])
		to, _ := chainage.ParsePoint(cells[2])
		t.Rows = append(t.Rows, Row{Line: i + 2, Name: cells[0], From: from, To: to, Start: from.Chainage, Cells: cells})
	}
	return t
}

// parts are rows of a kilometre each.
func parts(n int) *Table {
	var text []string
	for i := range n {
		text = append(text, fmt.Sprintf(". %d %d 90 .", i, i+1))
	}
	return tableOf(text...)
}

func show(old, now *Table, list []Difference) string {
	var b strings.Builder
	for _, d := range list {
		fmt.Fprintf(&b, "%s", d.Kind)
		for _, i := range d.Old {
			fmt.Fprintf(&b, " -%d", old.Rows[i].Line)
		}
		for _, i := range d.New {
			fmt.Fprintf(&b, " +%d", now.Rows[i].Line)
		}
		for _, c := range d.Cells {
			fmt.Fprintf(&b, " %s:%s>%s", old.Columns[c.Column], old.Rows[c.Old].Cells[c.Column], now.Rows[c.New].Cells[c.Column])
		}
		b.WriteByte('\n')
	}
	return b.String()
}

func TestCompare(t *testing.T) {
	tests := []struct {
		name     string
		old, now *Table
		want     string
	}{
		{"equal", tableOf(". 0 10 90 ."), tableOf(". 0 10 90 ."), ""},
		{"only the order of the rows", tableOf(". 0 10 90 .", ". 10 20 80 ."), tableOf(". 10 20 80 .", ". 0 10 90 ."), ""},
		{"a cell", tableOf(". 0 10 90 .", ". 10 20 80 ."), tableOf(". 0 10 90 .", ". 10 20 100 ."), "altered -3 +3 basic:80>100\n"},
		{"a row inserted", tableOf(". 0 10 90 .", ". 20 30 90 ."), tableOf(". 0 10 90 .", ". 12 14 50 .", ". 20 30 90 ."), "added +3\n"},
		{"a row removed", tableOf(". 0 10 90 .", ". 12 14 50 ."), tableOf(". 0 10 90 ."), "removed -3\n"},
		{"a boundary moved", tableOf(". 0 10 90 .", ". 10 20 80 ."), tableOf(". 0 9 90 .", ". 9 20 80 ."),
			"altered -2 +2 to_km:10>9\naltered -3 +3 from_km:10>9\n"},
		{"split, one half altered", tableOf(". 0 10 90 .", ". 10 20 80 ."), tableOf(". 0 4 90 .", ". 4 10 100 .", ". 10 20 80 ."),
			"split -2 +2 +3 to_km:10>4 from_km:0>4 basic:90>100\n"},
		{"merged", tableOf(". 0 4 90 .", ". 4 10 90 ."), tableOf(". 0 10 90 ."), "merged -2 -3 +2 to_km:4>10\n"},
		{"moved as a whole", tableOf(". 0 1 40 ."), tableOf(". 50 51 40 ."), "altered -2 +2 from_km:0>50 to_km:1>51\n"},
		{"another row elsewhere", tableOf(". 0 1 40 ."), tableOf(". 50 51 60 ."), "removed -2\nadded +2\n"},
		{"named rows stay together", tableOf("T1 0 1 40 .", "T2 5 6 50 ."), tableOf("T2 0 1 60 .", "T1 70 71 20 ."),
			"altered -3 +2 from_km:5>0 to_km:6>1 basic:50>60\naltered -2 +3 from_km:0>70 to_km:1>71 basic:40>20\n"},
		{"parts that end elsewhere are no split", tableOf(". 0 10 90 ."), tableOf(". 0 4 90 .", ". 4 11 90 ."), "altered -2 +2 to_km:10>4\nadded +3\n"},
		{"parts with a gap are no split", tableOf(". 0 10 90 ."), tableOf(". 0 4 90 .", ". 5 10 90 ."), "altered -2 +2 to_km:10>4\nadded +3\n"},
		{"eight parts are a split", tableOf(". 0 8 90 ."), parts(8), "split -2 +2 +3 +4 +5 +6 +7 +8 +9 to_km:8>1 from_km:0>1 to_km:8>2 from_km:0>2 to_km:8>3 from_km:0>3 to_km:8>4 from_km:0>4 to_km:8>5 from_km:0>5 to_km:8>6 from_km:0>6 to_km:8>7 from_km:0>7\n"},
		{"nine are none", tableOf(". 0 9 90 ."), parts(9), "altered -2 +2 to_km:9>1\nadded +3\nadded +4\nadded +5\nadded +6\nadded +7\nadded +8\nadded +9\nadded +10\n"},
		{"eight parts merged", parts(8), tableOf(". 0 8 90 ."), "merged -2 -3 -4 -5 -6 -7 -8 -9 +2 to_km:1>8\n"},
		{"nine are not", parts(9), tableOf(". 0 9 90 ."), "altered -2 +2 to_km:1>9\nremoved -3\nremoved -4\nremoved -5\nremoved -6\nremoved -7\nremoved -8\nremoved -9\nremoved -10\n"},
		{"made smaller", tableOf(". 0 10 90 ."), tableOf(". 2 8 100 ."), "altered -2 +2 from_km:0>2 to_km:10>8 basic:90>100\n"},
		{"made larger", tableOf(". 2 8 100 ."), tableOf(". 0 10 90 ."), "altered -2 +2 from_km:2>0 to_km:8>10 basic:100>90\n"},
		{"side by side", tableOf(". 0 2 90 ."), tableOf(". 2 4 100 ."), "removed -2\nadded +2\n"},
		{"one beginning, where the posts go back", tableOf(". 5 3#2 90 ."), tableOf(". 5 2#2 100 ."), "altered -2 +2 to_km:3#2>2#2 basic:90>100\n"},
		{"one end, where the posts go back", tableOf(". 5 3#2 90 ."), tableOf(". 6 3#2 100 ."), "altered -2 +2 from_km:5>6 basic:90>100\n"},
		{"equal rows twice", tableOf(". 0 1 40 .", ". 0 1 40 ."), tableOf(". 0 1 40 ."), "removed -3\n"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if got := show(test.old, test.now, Compare(test.old, test.now)); got != test.want {
				t.Errorf("got\n%swant\n%s", got, test.want)
			}
		})
	}
}

// Law: applying the differences to the old rows gives the new rows.
func TestCompareIsComplete(t *testing.T) {
	rowsOf := rapid.Custom(func(t *rapid.T) *Table {
		var text []string
		at := 0
		for range rapid.IntRange(0, 9).Draw(t, "rows") {
			from := at
			at += rapid.IntRange(1, 3).Draw(t, "length")
			if rapid.IntRange(0, 9).Draw(t, "overlap") == 0 {
				at = from + 1
			}
			name := rapid.SampledFrom([]string{".", ".", ".", "T1", "T2"}).Draw(t, "name")
			text = append(text, fmt.Sprintf("%s %d %d %d %s", name, from, at, 10*rapid.IntRange(4, 6).Draw(t, "speed"), rapid.SampledFrom([]string{".", "n"}).Draw(t, "note")))
		}
		return tableOf(text...)
	})
	rapid.Check(t, func(t *rapid.T) {
		old, now := rowsOf.Draw(t, "old"), rowsOf.Draw(t, "new")
		list := Compare(old, now)
		key := func(cells []string) string { return strings.Join(cells, ",") }
		var got, want []string
		for _, cells := range Apply(old, now, list) {
			got = append(got, key(cells))
		}
		for _, r := range now.Rows {
			want = append(want, key(r.Cells))
		}
		slices.Sort(got)
		slices.Sort(want)
		if !slices.Equal(got, want) {
			t.Fatalf("got %q, want %q by\n%s", got, want, show(old, now, list))
		}
		if len(list) > max(len(old.Rows), len(now.Rows))+min(len(old.Rows), len(now.Rows)) {
			t.Fatalf("%d differences", len(list))
		}
	})
}

// Tables that differ in very many rows are still accounted for completely.
func TestCompareManyRows(t *testing.T) {
	old, now := tableOf(), tableOf()
	for i := range 1500 {
		for k, table := range []*Table{old, now} {
			p := chainage.Point{Chainage: unit.Distance(i) * unit.Kilometre}
			q := chainage.Point{Chainage: unit.Distance(i+1) * unit.Kilometre}
			table.Rows = append(table.Rows, Row{Line: i, From: p, To: q, Start: p.Chainage,
				Cells: []string{"", p.String(), q.String(), fmt.Sprint(50 + 5*k), ""}})
		}
	}
	// One is only in the old table, and two are only in the new one.
	now.Rows = slices.Delete(now.Rows, 700, 701)
	now.Rows = append(now.Rows, now.Rows[0], tableOf(". 1600 1601 90 .").Rows[0])
	list := Compare(old, now)
	count := map[Kind]int{}
	for _, d := range list {
		count[d.Kind]++
	}
	if !maps.Equal(count, map[Kind]int{Altered: 1499, Removed: 1, Added: 2}) {
		t.Errorf("%v", count)
	}
}
