package trace_test

import (
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
	"speedtrail/history/internal/past"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
	"speedtrail/schema"
	"speedtrail/schema/codes"
	"speedtrail/schema/unit"
)

// files is a data set of one route whose rows are given.
func files(folder, head, rows string) map[string]string {
	return map[string]string{
		"dataset.toml":                         "format = 1\nname = \"Story\"\n",
		"trains.toml":                          "[[train]]\nid = \"T\"\nname = \"T\"\ncant_deficiency_mm = 80\naxle_load = \"A\"\nlength_m = 100\nmax_speed_kmh = 200\n",
		"routes/" + folder + "/route.toml":     "id = \"R\"\nname = \"R\"\n" + head,
		"routes/" + folder + "/speed.csv":      "from_km,to_km,basic\n" + rows,
		"requests/" + folder + "/nothing.text": "not read",
	}
}

const plainHead = "start_km = 0\nend_km = 10\n"

// readStory writes a history to a repository and reads the past of route R up to HEAD.
func readStory(t *testing.T, history []compose.Commit) (*revision.Repo, *trace.History) {
	t.Helper()
	repo, err := revision.Open(past.Write(t, history))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { repo.Close() })
	head, err := repo.Resolve("HEAD")
	if err != nil {
		t.Fatal(err)
	}
	tip, err := trace.ParseHash(head.Hash)
	if err != nil {
		t.Fatal(err)
	}
	h, err := trace.NewReader(repo, ".").History(t.Context(), tip, "R", trace.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return repo, h
}

// A history written by hand, with its trails.
func TestStory(t *testing.T) {
	at := func(day int) time.Time { return time.Date(2024, 1, day, 0, 0, 0, 0, time.UTC) }
	broken := files("r", plainHead, "0,10,77\n")
	jump := "start_km = 0\nend_km = 10.5\n[[jump]]\narriving_km = 3\nleaving_km = 3.5\n"
	history := []compose.Commit{
		{Files: map[string]string{"README": "no data set yet"}, Message: "0 nothing"},
		{Parents: []int{0}, Files: files("r", plainHead, "0,5,100\n5,10,80\n"), Message: "1 first"},
		{Parents: []int{1}, Files: files("r", plainHead, "# a note\n0,5,100\n5,10,80\n"), Message: "2 note"},
		{Parents: []int{2}, Files: broken, Message: "3 broken"},
		{Parents: []int{3}, Files: broken, Message: "4 still broken"},
		{Parents: []int{4}, Files: files("r", plainHead, "0,5,90\n5,10,80\n"), Message: "5 repaired and lowered"},
		{Parents: []int{5}, Files: files("other", plainHead, "0,5,90\n5,10,80\n"), Message: "6 renamed"},
		{Parents: []int{6}, Files: files("other", plainHead, "0,5,60\n5,10,80\n"), Message: "7 branch: lowered"},
		{Parents: []int{6}, Files: files("other", plainHead, "0,5,90\n5,10,120\n"), Message: "8 main: raised beyond"},
		{Parents: []int{8, 7}, Files: files("other", plainHead, "0,5,60\n5,10,120\n"), Message: "9 merge of both"},
		{Parents: []int{9}, Files: files("other", plainHead, "0,5,50\n5,10,120\n"), Message: "10 branch: set aside later"},
		{Parents: []int{9, 10}, Files: files("other", plainHead, "0,5,60\n5,10,120\n"), Message: "11 merge without it"},
		{Parents: []int{11}, Files: files("other", jump, "0,5,60\n5,10.5,120\n"), Message: "12 posts from 3.0 to 3.5 are gone"},
		{Parents: []int{12}, Files: files("other", jump, "0,5,60\n5,10.5,120\n"), Message: "13 nothing"},
	}
	for i := range history {
		history[i].Author, history[i].When = compose.Person{Name: "A", Email: "a@story.example"}, at(i+1)
	}
	repo, h := readStory(t, history)
	train := schema.Train{ID: "T", Length: 100 * unit.Metre, Max: 200}
	number := func(c int32) string {
		commit, err := repo.Resolve(h.Commits[c].Hash.String())
		if err != nil {
			t.Fatal(err)
		}
		n, _, _ := strings.Cut(commit.Subject, " ")
		return n
	}
	tests := []struct {
		name  string
		at    unit.Distance
		first bool
		want  string
	}{
		{"in front of the jump", 2 * unit.Kilometre, false, "10: 60-50 aside; 7: 90-60; 5: 100-90 across 2; 1: 0-100"},
		{"the same, first parents", 2 * unit.Kilometre, true, "9: 90-60; 5: 100-90 across 2; 1: 0-100"},
		{"behind the jump: 5.2 reads what 4.7 of running distance reads now", 4_700 * unit.Metre, false, "8: 80-120; 1: 0-80"},
		{"the end: km 10.5 is new", 10 * unit.Kilometre, false, "12: 0-120"},
	}
	for _, c := range tests {
		trail := h.View(codes.Nominal, c.first).Point(train, c.at)
		var list []string
		for _, s := range trail.Steps {
			before := "none"
			if len(s.Before) > 0 {
				before = s.Before[0].Speed.String()
			}
			text := fmt.Sprintf("%s: %s-%s", number(s.After.Commit), before, s.After.Speed)
			if s.Across > 0 {
				text += fmt.Sprintf(" across %d", s.Across)
			}
			if s.Aside {
				text += " aside"
			}
			list = append(list, text)
		}
		if got := strings.Join(list, "; "); got != c.want {
			t.Errorf("%s: got %s, want %s", c.name, got, c.want)
		}
	}
	trail := h.View(codes.Nominal, false).Point(train, 2*unit.Kilometre)
	sources := []string{}
	for _, s := range trail.Steps {
		sources = append(sources, s.After.Sources[0].String())
	}
	want := []string{"routes/other/speed.csv:2 basic 50", "routes/other/speed.csv:2 basic 60", "routes/r/speed.csv:2 basic 90", "routes/r/speed.csv:2 basic 100"}
	if !slices.Equal(sources, want) {
		t.Errorf("sources %q", sources)
	}
	if v := h.View(codes.Nominal, false); len(v.Gaps()) != 2 || number(v.Gaps()[0]) != "4" || !strings.Contains(h.Commits[v.Gaps()[0]].Gap, "routes/r/speed.csv:2:6: basic") {
		t.Errorf("gaps %v", v.Gaps())
	}
	var pieces []string
	for _, p := range h.View(codes.Nominal, false).Stretch(train, 2*unit.Kilometre, 9*unit.Kilometre) {
		pieces = append(pieces, fmt.Sprintf("%s-%s %s from %s", p.From.M(), p.To.M(), p.Speed, number(p.Origin)))
	}
	// 100 m of run-out behind the lower speed date from the raise beyond it and
	// the merge that brought both together.
	if got, want := strings.Join(pieces, "; "), "2000-4500 60 from 7; 4500-4600 60 from 7; 4600-9000 120 from 8"; got != want && got != "2000-4600 60 from 7; 4600-9000 120 from 8" {
		t.Errorf("got  %s\nwant %s", got, want)
	}
}
