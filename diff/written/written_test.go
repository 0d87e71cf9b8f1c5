package written_test

import (
	"flag"
	"fmt"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"speedtrail/diff/rows"
	"speedtrail/diff/written"
	"speedtrail/schema/chainage"
	"speedtrail/schema/unit"
)

// check runs a property with the same draws each time, unless the flags of
// rapid ask for others.
func check(t *testing.T, checks int, property func(*rapid.T)) {
	t.Helper()
	for name, value := range map[string]string{"rapid.seed": "1", "rapid.checks": fmt.Sprint(checks), "rapid.nofailfile": "true"} {
		f := flag.Lookup(name)
		if old := f.Value.String(); old == f.DefValue {
			if err := f.Value.Set(value); err != nil {
				t.Fatal(err)
			}
			defer f.Value.Set(old)
		}
	}
	rapid.Check(t, property)
}

// tracks are none, one without jumps, and one whose posts from 4 to 5 km occur
// twice.
func tracks(t *testing.T) []*chainage.Track {
	list := []*chainage.Track{nil}
	for _, jumps := range [][]chainage.Jump{nil, {{Arriving: 5 * unit.Kilometre, Leaving: 4 * unit.Kilometre}}} {
		track, err := chainage.NewTrack(0, 20*unit.Kilometre, jumps)
		if err != nil {
			t.Fatal(err)
		}
		list = append(list, track)
	}
	return list
}

// applied gives the rows of the target as the account makes them of those of
// the base.
func applied(tables []written.Table) []string {
	var list []string
	for i := range tables {
		x := &tables[i]
		for _, cells := range rows.Apply(&x.Old, &x.New, rows.Compare(&x.Old, &x.New)) {
			row := map[string]string{}
			for c, cell := range cells {
				if cell != "" {
					row[x.New.Columns[c]] = cell
				}
			}
			if len(row) > 0 {
				list = append(list, rowText(x.Name, row))
			}
		}
	}
	slices.Sort(list)
	return list
}

// Law: the account of two files of any kind gives exactly the cells of the
// target, whatever the form of either; and two files have the same cells just if
// they say the same.
func TestAccountIsComplete(t *testing.T) {
	sides := tracks(t)
	for _, k := range kinds() {
		t.Run(k.file, func(t *testing.T) {
			equal, unequal := 0, 0
			check(t, 250, func(t *rapid.T) {
				base := k.draw(t)
				target := k.edit(t, base)
				if rapid.IntRange(0, 4).Draw(t, "another") == 0 {
					target = k.draw(t)
				}
				old, now := base.write(t), target.write(t)
				tables := written.Pair(k.file, old, now, rapid.SampledFrom(sides).Draw(t, "track"), rapid.SampledFrom(sides).Draw(t, "track"))
				want := target.cells()
				if got := applied(tables); !slices.Equal(got, want) {
					t.Fatalf("base\n%s\ntarget\n%s\ngot\n%s\nwant\n%s", old, now, strings.Join(got, "\n"), strings.Join(want, "\n"))
				}
				same := slices.Equal(base.cells(), want)
				if got := sameCells(tables); got != same {
					t.Fatalf("same cells: %t, want %t\nbase\n%s\ntarget\n%s", got, same, old, now)
				}
				if same {
					equal++
				} else {
					unequal++
				}
			})
			if !testing.Short() && (equal < 10 || unequal < 50) {
				t.Errorf("only %d equal and %d unequal pairs were drawn", equal, unequal)
			}
		})
	}
}

// The same content in two forms has the same cells; with one cell altered, it
// has not, and the account is that one cell.
func TestOneCell(t *testing.T) {
	for _, k := range kinds() {
		t.Run(k.file, func(t *testing.T) {
			check(t, 150, func(t *rapid.T) {
				base := k.draw(t)
				old := base.write(t)
				if tables := written.Pair(k.file, old, base.write(t), nil, nil); !sameCells(tables) {
					t.Fatalf("two forms of %s", base.describe())
				}
				target := base.clone()
				s := rapid.SampledFrom(target.tables).Draw(t, "table")
				if len(s.rows) == 0 {
					return
				}
				row := rapid.SampledFrom(s.rows).Draw(t, "row")
				c := rapid.SampledFrom(k.tables[s.name]).Draw(t, "column")
				v := c.value.Draw(t, "value")
				if v == row[c.name] || v == "" && c.needed {
					return
				}
				row[c.name] = v
				now := target.write(t)
				tables := written.Pair(k.file, old, now, nil, nil)
				if sameCells(tables) {
					t.Fatalf("%s altered to %q is not seen in\n%s\nand\n%s", c.name, v, old, now)
				}
			})
		})
	}
}

// A file that one side does not have is rows added or removed, every cell of
// them.
func TestFileOfOneSide(t *testing.T) {
	for _, k := range kinds() {
		t.Run(k.file, func(t *testing.T) {
			check(t, 50, func(t *rapid.T) {
				d := k.draw(t)
				content, want := d.write(t), d.cells()
				tables := written.Pair(k.file, nil, content, nil, nil)
				if got := applied(tables); !slices.Equal(got, want) {
					t.Fatalf("new file: got %q, want %q", got, want)
				}
				for i := range tables {
					for _, x := range rows.Compare(&tables[i].Old, &tables[i].New) {
						if x.Kind != rows.Added || len(x.New) != 1 {
							t.Fatalf("new file: %v", x)
						}
					}
				}
				tables = written.Pair(k.file, content, nil, nil, nil)
				removed := 0
				for i := range tables {
					for _, x := range rows.Compare(&tables[i].Old, &tables[i].New) {
						if x.Kind != rows.Removed {
							t.Fatalf("removed file: %v", x)
						}
						if len(tables[i].Old.Columns) > 0 {
							removed++
						}
					}
				}
				if got := applied(tables); len(got) > 0 || removed != len(want) {
					t.Fatalf("removed file: left %q, %d rows removed of %d", got, removed, len(want))
				}
			})
		})
	}
}

// sameCells tells whether two files hold the same rows with the same cells, in
// whatever order.
func sameCells(tables []written.Table) bool {
	return !slices.ContainsFunc(tables, func(t written.Table) bool { return len(rows.Compare(&t.Old, &t.New)) > 0 })
}

func TestSameValue(t *testing.T) {
	for _, x := range []struct {
		column, a, b string
		want         bool
	}{
		{"from_km", "1", "1.0", true}, {"from_km", "1.000000", "1", true}, {"from_km", "-0.5", "-0.500", true}, {"speed", "007", "7", true},
		{"from_km", "4.5", "4.5#1", true}, {"from_km", `"4.500#1"`, "4.5", true}, {"from_km", `"31.180#2"`, `"31.18#2"`, true},
		{"from_km", "4.5", "4.5#2", false}, {"from_km", "1", "1.000001", false}, {"from_km", "1", "-1", false}, {"cd150", "", "0", false}, {"cd150", "", "", true},
		{"train_length_delay", "yes", "no", false}, {"note", "a", "A", false}, {"train_length_delay", "yes", "yes", true}, {"trains", "[1]", "[1.0]", false},
		{"note", "1", "1.0", false}, {"id", "7", "07", false}, {"name", `"7"`, `"7.0"`, false}, {"reason", "4.5", "4.5#1", false},
		{"principal", `"7"`, `"7.0"`, false}, {"route", `"1"`, `"1.0"`, false}, {"route", `"1"`, `"1"`, true},
	} {
		if got := written.SameValue(x.column, x.a, x.b); got != x.want {
			t.Errorf("%s %q and %q: got %t", x.column, x.a, x.b, got)
		}
		if got := written.SameValue(x.column, x.b, x.a); got != x.want {
			t.Errorf("%s %q and %q: got %t", x.column, x.b, x.a, got)
		}
	}
}
