package main

import (
	"fmt"
	"path/filepath"
	"slices"
	"testing"
	"time"

	"speedtrail/history/compose"
	"speedtrail/history/revision"
)

// A commit of the approved content on parents that were approved before brings nothing,
// and who made it prepared nothing. One that goes back to that content from another
// one does, and so does one without parents.
func TestWithoutCopies(t *testing.T) {
	keys := t.TempDir()
	dir := filepath.Join(t.TempDir(), "repo")
	var list []compose.Commit
	for i, c := range []struct {
		speed   int
		parents []int
	}{
		{60, nil}, {80, []int{0}}, {60, []int{1}}, {60, []int{0}}, {90, []int{0}}, {60, []int{3, 1}}, {60, []int{3}}, {60, nil},
	} {
		list = append(list, compose.Commit{
			Files: plainFiles(t, keys, c.speed), Author: compose.Person{Name: "Cem Orr", Email: "cem@tarn.example"}, When: time.Date(2026, 3, 1, 12, i, 0, 0, time.UTC),
			Message: fmt.Sprintf("Commit %d\n", i), Tag: fmt.Sprintf("c%d", i), TagText: "Release\n", Parents: c.parents,
		})
	}
	if err := compose.Write(t.Context(), dir, list); err != nil {
		t.Fatal(err)
	}
	repo, err := revision.Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	defer repo.Close()
	commit := func(n int) revision.Commit {
		c, err := repo.Resolve(fmt.Sprintf("c%d", n))
		if err != nil {
			t.Fatal(err)
		}
		return c
	}
	files, err := repo.Snapshot(commit(0).Hash, ".")
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name        string
		since, want []int
	}{
		{"a copy on what was approved", []int{3}, nil},
		{"another content", []int{4, 1}, []int{4, 1}},
		{"back to it from another content", []int{1, 2}, []int{1, 2}},
		{"a copy among others", []int{4, 3, 1}, []int{4, 1}},
		{"a copy of a copy is on one that was not approved", []int{6, 3}, []int{6}},
		{"a merge of another content", []int{5, 3, 1}, []int{5, 1}},
		{"without parents", []int{7}, []int{7}},
	} {
		var commits, want []revision.Commit
		for _, n := range c.since {
			commits = append(commits, commit(n))
		}
		for _, n := range c.want {
			want = append(want, commit(n))
		}
		got, err := withoutCopies(repo, commits, content(files), ".")
		if err != nil || !slices.EqualFunc(got, want, func(a, b revision.Commit) bool { return a.Hash == b.Hash }) {
			t.Errorf("%s: %v, %v", c.name, got, err)
		}
	}
}
