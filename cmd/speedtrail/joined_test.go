package main

import (
	"fmt"
	"maps"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// revisions writes two revisions of a data set with one route, as commits.
func revisions(t *testing.T, base, target map[string]string) string {
	t.Helper()
	repo := filepath.Join(t.TempDir(), "repo")
	who := compose.Person{Name: "Bo Tarn", Email: "bo@tarn.example"}
	when := time.Date(2026, 3, 2, 10, 0, 0, 0, time.UTC)
	frame := map[string]string{"dataset.toml": "format = 1\nname = \"Joined\"\n", "routes/r1/route.toml": "id = \"R1\"\nname = \"Route\"\nstart_km = 0\nend_km = 10\ndirections = [\"nominal\"]\n"}
	var history []compose.Commit
	for i, files := range []map[string]string{base, target} {
		all := maps.Clone(frame)
		for name, content := range files {
			if !strings.HasSuffix(name, ".toml") {
				name = "routes/r1/" + name
			}
			all[name] = content
		}
		c := compose.Commit{Files: all, Author: who, When: when.Add(time.Duration(i) * time.Hour), Message: "Revision\n"}
		if i > 0 {
			c.Parents = []int{0}
		}
		history = append(history, c)
	}
	if err := compose.Write(t.Context(), repo, history); err != nil {
		t.Fatal(err)
	}
	return repo
}

// trainsOf writes trains.toml: an id, an axle load and a length each.
func trainsOf(list ...string) string {
	var b strings.Builder
	for _, x := range list {
		var id, axle string
		var length int
		fmt.Sscan(x, &id, &axle, &length)
		fmt.Fprintf(&b, "[[train]]\nid = %q\nname = \"A train\"\ncant_deficiency_mm = 100\naxle_load = %q\nlength_m = %d\nmax_speed_kmh = 120\n", id, axle, length)
	}
	return b.String()
}

// Changes are told as one only where the same rows make them, and as one of the length
// of the train only where that is what differs.
func TestJoinedChanges(t *testing.T) {
	const axle = "from_km,to_km,A,C2,D4,train_length_delay\n"
	static := func(first string, v int) string {
		return fmt.Sprintf("from_km,to_km,basic,train_length_delay\n0,1,%s\n1,3,%d,no\n3,10,100,no\n", first, v)
	}
	for _, x := range []struct {
		name         string
		base, target map[string]string
		lines        []string // of the changes
		drawn        string   // the train whose chart stands for others
		charts       int
	}{
		{"rows of their own",
			map[string]string{"trains.toml": trainsOf("P A 400", "Q C2 400", "S D4 400"), "speed.csv": static("100,no", 100), "axle-load.csv": axle + "0.5,2,80,,,no\n1,2,,80,,no\n1,3,,,80,no\n"},
			map[string]string{"axle-load.csv": axle},
			[]string{"km 0.500 to 2.000  80 to 100 km/h +20", "P", "before routes/r1/axle-load.csv:2 axle load A: 80 km/h", "km 1.000 to 2.000  80 to 100 km/h +20", "Q", "km 1.000 to 3.000  80 to 100 km/h +20", "S"}, "", 3},
		{"one row, and another that ends it for one train", // 300 m earlier, as are the lengths apart
			map[string]string{"trains.toml": trainsOf("P A 100", "S D4 400"), "speed.csv": static("100,no", 80), "axle-load.csv": axle + "2.7,3,60,,,no\n"},
			map[string]string{"speed.csv": static("100,no", 100)},
			[]string{"km 1.000 to 2.700 .. 3.000  80 to 100 km/h +20 by train", "P, S"}, "S", 1},
		{"the length of the train",
			map[string]string{"trains.toml": trainsOf("P A 100", "Q A 200", "S D4 400"), "speed.csv": static("60,yes", 80)},
			map[string]string{"speed.csv": static("60,yes", 100)},
			[]string{"km 1.100 .. 1.400 to 3.000  80 to 100 km/h +20 by train length", "P, Q, S"}, "P", 1},
		{"no end that all share", // P and Q begin together, Q and S end together
			map[string]string{"trains.toml": trainsOf("P A 400", "Q C2 400", "S D4 400"), "speed.csv": static("100,no", 80), "axle-load.csv": axle + "2,3,60,,,no\n1,1.5,,,60,no\n"},
			map[string]string{"speed.csv": static("100,no", 100)},
			[]string{"km 1.000 to 2.000 .. 3.000  80 to 100 km/h +20 by train", "P, Q", "km 1.500 to 3.000  80 to 100 km/h +20", "S"}, "Q", 1},
	} {
		t.Run(x.name, func(t *testing.T) {
			target := maps.Clone(x.base)
			maps.Copy(target, x.target)
			repo := revisions(t, x.base, target)
			assess := func(format string) string {
				return call(t, "--repo", repo, "assess", "HEAD~1", "HEAD", "--no-record", "--request", "none", "--format", format).out
			}
			_, text, _ := strings.Cut(assess("text"), "CHANGES ON")
			text, _, _ = strings.Cut(text, "DECLARED AGAINST")
			got := "\n" + strings.Join(strings.Fields(strings.ReplaceAll(text, "\n", " | ")), " ")
			for _, want := range x.lines {
				if want = "| " + strings.Join(strings.Fields(want), " ") + " |"; !strings.Contains(got, want) {
					t.Errorf("%q is not in%s", want, text)
				}
			}
			page := assess("html")
			if n := strings.Count(page, "<article"); n != x.charts {
				t.Errorf("%d charts, want %d", n, x.charts)
			}
			if (x.drawn != "") != strings.Contains(page, "The chart is that of") || !strings.Contains(page, "The chart is that of "+x.drawn) && x.drawn != "" {
				t.Errorf("the chart that stands for others is not that of %q", x.drawn)
			}
		})
	}
}
