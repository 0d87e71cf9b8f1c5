package main

import (
	"maps"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// Track that became longer takes every train longer. One that sees no change of speed
// is shown with its running time, and "no change" is said of none.
func TestLongerTrack(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	who := compose.Person{Name: "Cem Orr", Email: "cem@tarn.example"}
	files := plainFiles(t, t.TempDir(), 100)
	files["trains.toml"] += "acceleration_ms2 = 0.5\nbraking_ms2 = 0.5\n\n" + strings.Replace(files["trains.toml"], `"T"`, `"U"`, 1)
	delete(files, "routes/r1/temporary.csv")
	target := maps.Clone(files)
	target["routes/r1/route.toml"] += "[[jump]]\narriving_km = 4.0\nleaving_km = 3.0\n"
	target["routes/r1/speed.csv"] = "from_km,to_km,basic\n0,5,100\n"
	repo := filepath.Join(t.TempDir(), "repo")
	err := compose.Write(t.Context(), repo, []compose.Commit{
		{Files: files, Author: who, When: at, Message: "One\n", Tag: "c0", TagText: "One\n"},
		{Parents: []int{0}, Files: target, Author: who, When: at.Add(time.Hour), Message: "Two\n", Tag: "c1", TagText: "Two\n"},
	})
	if err != nil {
		t.Fatal(err)
	}
	// 5 km at 100 km/h, stop to stop: 180 s and 55.556 s; 1 km more takes 36 s, in
	// each direction.
	for format, want := range map[string][]string{
		"text":     {"on the only route of the target, where both revisions have the track.", "Running time where the track differs: up to +36.0 s (T).", "T +72.0 running time only: R1", "U no change of speed", "R1 nominal T 3:55.6 4:31.6 +36.0", "R1 reverse T 3:55.6 4:31.6 +36.0"},
		"markdown": {"| T | | | | | +72.0 | running time only: R1 |", "| U | | | | | | no change of speed |", "| R1 | reverse | T | 3:55.6 | 4:31.6 | +36.0 |"},
		"html":     {`<td>&#43;72.0</td><td class="text">running time only: R1</td>`, `<td colspan="6" class="text none">no change of speed</td>`},
		"json":     {`"after_ds": 2716, "before_ds": 2356, "direction": "reverse"`},
	} {
		out := call(t, "--repo", repo, "assess", "c0", "c1", "--no-record", "--format", format).want(t, 1).out
		for _, w := range want {
			if !strings.Contains(oneLine(out), w) {
				t.Errorf("%s does not say %q", format, w)
			}
		}
		if strings.Contains(out, "no change\n") || strings.Contains(out, "no change<") || strings.Contains(out, "no change |") {
			t.Errorf("%s says that nothing changes for a train", format)
		}
	}
	got := call(t, "--repo", repo, "assess", "c0", "c1", "--no-record", "--format", "csv").want(t, 1)
	if want := "! stretches of track that only one revision has, and that CSV does not hold: 2; the other formats have them"; !strings.Contains(got.errors, want) {
		t.Errorf("csv: %s", got.errors)
	}
}
