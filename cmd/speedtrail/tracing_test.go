package main

import (
	"database/sql"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// The first second of 1970 is a time, wherever a trace writes it: no place of the
// document takes it for none (TestNoTime has those).
func TestTraceOfSecondZero(t *testing.T) {
	repo := composed(t, t.TempDir(), []int{60, 80, 85}, []time.Time{time.Unix(0, 0).UTC(), time.Unix(0, 0).UTC(), time.Unix(86400, 0).UTC()})
	for name, asked := range map[string][]string{"line": {"--at", "1.5"}, "bands": {"--from", "1", "--to", "3"}} {
		got := call(t, append([]string{"--repo", repo, "trace", "c2", "--route", "R1", "--format", "json"}, asked...)...).want(t, 0)
		if strings.Contains(got.out, `"committed": ""`) {
			t.Errorf("%s: a commit without a time: %s", name, got.out)
		}
	}
}

// A trace that finds its index damaged makes it again and says so, once.
func TestTraceHealsIndex(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, t.TempDir(), []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	args := []string{"--repo", repo, "trace", "c1", "--route", "R1", "--at", "1.5"}
	sound := call(t, args...).want(t, 0)
	db, err := sql.Open("sqlite3", filepath.Join(repo, ".git", "speedtrail", "index.db"))
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	if _, err := db.Exec("UPDATE version SET data = x''"); err != nil {
		t.Fatal(err)
	}
	const remark = "the index is damaged, it is made again\n"
	if got := call(t, args...).want(t, 0); got.out != sound.out || strings.Count(got.errors, remark) != 1 {
		t.Errorf("%s%s", got.errors, got.out)
	}
	if got := call(t, args...).want(t, 0); got.out != sound.out || got.errors != sound.errors {
		t.Errorf("%s%s", got.errors, got.out)
	}
}
