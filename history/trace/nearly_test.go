package trace_test

import (
	"context"
	"errors"
	"maps"
	"slices"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// A revision with a name that is nearly one that is read does not load, and is a
// gap with the reason that loading it gives.
func TestNearlyNamedIsAGap(t *testing.T) {
	good := files("r", plainHead, "0,10,100\n")
	with := func(more string) map[string]string {
		out := maps.Clone(good)
		out[more] = "x"
		return out
	}
	none := map[string]string{"README": "y"}
	changes := []map[string]string{
		none, {"Dataset.toml": "x", "README": "y"}, good, with("acepted.toml"), good, with("DATASET.TOML"), with("trains.tomls"), with("Routes/x/y"), with("routes2/y"), with("requestss/y"), with("Requests/y"),
		with("signof.toml"), with("routes/acepted.txt"), with("notes.md"), with("trains.toml~"), good,
	}
	var history []compose.Commit
	for i, x := range changes {
		c := compose.Commit{Files: x, Message: strings.Join(slices.Sorted(maps.Keys(x)), " "), Author: compose.Person{Name: "A", Email: "a@story.example"}, When: time.Date(2024, 1, i+1, 0, 0, 0, 0, time.UTC)}
		if _, ok := x["README"]; ok && len(x) == 1 {
			c.Message = "no data set"
		}
		if i > 0 {
			c.Parents = []int{i - 1}
		}
		history = append(history, c)
	}
	repo, h := readStory(t, history)
	gaps := 0
	for _, c := range h.Commits {
		files, err := repo.Snapshot(c.Hash.String(), ".")
		if err != nil {
			t.Fatal(err)
		}
		want := ""
		var faults *source.Faults
		if _, err := schema.Load(context.Background(), files); errors.As(err, &faults) {
			want = faults.List[0].Error()
		}
		commit, err := repo.Resolve(c.Hash.String())
		if err != nil {
			t.Fatal(err)
		}
		if commit.Subject == "no data set" {
			want = ""
		}
		if c.Gap != want {
			t.Errorf("%s: gap %q, want %q", commit.Subject, c.Gap, want)
		}
		if strings.Contains(c.Gap, "the name is nearly") {
			gaps++
		}
	}
	if gaps != 9 {
		t.Errorf("%d gaps of nearly right names, want 9", gaps)
	}
}
