package assessment_test

import (
	"slices"
	"testing"

	"speedtrail/history/assessment"
)

// doubtfulFiles hold doubtful data of several kinds; an acceptance covers one.
var doubtfulFiles = texts{
	"dataset.toml":  ground["dataset.toml"] + "[limits]\nlargest_step_kmh = 60\n",
	"speed.csv":     "from_km,to_km,basic,cd100,cd130\n0,4,100,110,105\n4,6,20,,\n6,20,100,,\n",
	"temporary.csv": "id,from_km,to_km,speed,valid_to\nTSR-1,8,9,40,2026-01-31\nTSR-2,10,11,40,2026-06-30\nTSR-3,12,13,200,\n",
	"accepted.toml": "[[accepted]]\nfinding = \"step-size\"\nroute = \"R1\"\nfrom_km = 4\nto_km = 4\nreason = \"throat\"\n" +
		"[[accepted]]\nfinding = \"step-size\"\nroute = \"R1\"\nfrom_km = 6\nto_km = 6\nreason = \"was looked at\"\nuntil = 2025-12-31\n",
}

// Law: what one revision holds of doubtful data is what an assessment finds that alters
// nothing of it on a route that differs.
func TestDoubtfulData(t *testing.T) {
	files := over(ground, doubtfulFiles)
	d, err := load(files)
	if err != nil {
		t.Fatal(err)
	}
	got := assessment.DoubtfulData(d, at)
	c := compute(t, doubtfulFiles, texts{"speed.csv": doubtfulFiles["speed.csv"] + "# another line\n"}, nil)
	want := slices.DeleteFunc(slices.Clone(c.Findings), func(f assessment.Finding) bool {
		_, mine := map[string]bool{"category-order": true, "step-size": true, "temporary-expired": true, "temporary-without-effect": true}[f.ID]
		return !mine
	})
	for i := range want {
		want[i].AlsoInBase = false
	}
	if !slices.Equal(got.Findings, want) {
		t.Errorf("got\n%v\nwant\n%v", got.Findings, want)
	}
	var places []string
	for _, f := range got.Findings {
		places = append(places, place(f)+" "+f.Row+" "+f.Accepted)
	}
	if expect := []string{
		"category-order both 0.000-4.000 routes/r1/speed.csv:2 ",
		"step-size both 6.000-6.000 routes/r1/speed.csv:3 ",
		"temporary-expired both 8.000-9.000 routes/r1/temporary.csv:2 ",
		"temporary-without-effect both 12.000-13.000 routes/r1/temporary.csv:4 ",
		"step-size both 4.000-4.000 routes/r1/speed.csv:3 throat",
	}; !slices.Equal(places, expect) {
		t.Errorf("got %q\nwant %q", places, expect)
	}
	if got.Open() != 4 {
		t.Errorf("%d open, want 4", got.Open())
	}
	var states []string
	for _, a := range got.Accepted {
		states = append(states, a.State)
	}
	if !slices.Equal(states, []string{"used", "over"}) {
		t.Errorf("acceptances are %q", states)
	}
	if !slices.Equal(got.Unchecked, []string{"cant-excess", "short-stretch"}) || len(got.Explained) != 4 {
		t.Errorf("unchecked %q, explained %v", got.Unchecked, got.Explained)
	}
}

// Nothing doubtful is an empty list, not none: a reader of JSON can tell that it was
// looked for.
func TestNothingDoubtful(t *testing.T) {
	d, err := load(ground)
	if err != nil {
		t.Fatal(err)
	}
	got := assessment.DoubtfulData(d, at)
	if got.Findings == nil || got.Accepted == nil || got.Explained == nil || got.Open() != 0 {
		t.Errorf("%+v", got)
	}
}
