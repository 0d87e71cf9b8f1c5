package trace_test

import (
	"errors"
	"maps"
	"slices"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
	"speedtrail/history/internal/past"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
	"speedtrail/schema/source"
)

// The requests in play at a commit are those that differ from its base's; where one of
// them does not load, that is said, and none is taken for all.
func TestRequests(t *testing.T) {
	request := func(title string) string { return "id = \"CR-1\"\ntitle = \"" + title + "\"\nreason = \"why\"\n" }
	with := func(name, content string) map[string]string {
		out := maps.Clone(files("r", plainHead, "0,10,100\n"))
		out["requests/"+name] = content
		return out
	}
	var history []compose.Commit
	for i, x := range []map[string]string{
		files("r", plainHead, "0,10,100\n"), with("CR-1.toml", request("first")), with("CR-1.toml", request("second")), with("CR-1.toml", "id = CR-1\n"), with("CR-1.toml", request("second")),
	} {
		c := compose.Commit{Files: x, Message: "m", Author: compose.Person{Name: "A", Email: "a@story.example"}, When: time.Date(2024, 1, i+1, 0, 0, 0, 0, time.UTC)}
		if i > 0 {
			c.Parents = []int{i - 1}
		}
		history = append(history, c)
	}
	repo, err := revision.Open(past.Write(t, history))
	if err != nil {
		t.Fatal(err)
	}
	defer repo.Close()
	var commits []trace.Hash // the oldest first
	for name := "HEAD"; name != ""; {
		c, err := repo.Resolve(name)
		if err != nil {
			t.Fatal(err)
		}
		hash, err := trace.ParseHash(c.Hash)
		if err != nil {
			t.Fatal(err)
		}
		link, err := repo.Link(hash)
		if err != nil {
			t.Fatal(err)
		}
		commits, name = append(commits, hash), ""
		for _, p := range link.Parents {
			name = trace.Hash(p).String()
		}
	}
	slices.Reverse(commits)
	for _, c := range []struct {
		name         string
		base, target int
		want         string // titles; - for an error of what does not load
	}{
		{"added", 0, 1, "first"}, {"altered", 1, 2, "second"}, {"the same", 2, 4, ""}, {"removed", 1, 0, ""},
		{"one that does not load", 2, 3, "-"}, {"after one that does not load", 3, 4, "-"},
	} {
		list, err := trace.Requests(t.Context(), repo, ".", commits[c.base], commits[c.target])
		var titles []string
		for _, q := range list {
			titles = append(titles, q.Title)
		}
		var faults *source.Faults
		if c.want == "-" && (!errors.As(err, &faults) || list != nil) || c.want != "-" && (err != nil || strings.Join(titles, " ") != c.want) {
			t.Errorf("%s: %q, %v", c.name, titles, err)
		}
	}
}
