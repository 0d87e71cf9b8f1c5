package main

import (
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// A request that was right for a revision in between does not make a data set faulty,
// and what to do about it is said.
func TestRequestOfARevisionInBetween(t *testing.T) {
	keys, dir := t.TempDir(), filepath.Join(t.TempDir(), "repo")
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	commit := func(n int, more string) compose.Commit {
		files := plainFiles(t, keys, 60)
		if more != "" {
			files["requests/cr.toml"] = more
		}
		c := compose.Commit{Files: files, Author: compose.Person{Name: "Cem Orr", Email: "cem@tarn.example"}, When: at, Message: "x\n", Tag: "c" + string(rune('0'+n)), TagText: "x\n"}
		if n > 0 {
			c.Parents = []int{n - 1}
		}
		return c
	}
	request := "id = \"CR-1\"\ntitle = \"t\"\nreason = \"r\"\n\n[[declares]]\nroute = \"R9\"\nfrom_km = 1\nto_km = 2\neffect = \"any\"\n"
	if err := compose.Write(t.Context(), dir, []compose.Commit{commit(0, ""), commit(1, request)}); err != nil {
		t.Fatal(err)
	}
	got := call(t, "--repo", dir, "assess", "--no-record", "c0", "c1").want(t, statusInput)
	for _, want := range []string{"requests in play of c1 do not fit the two revisions\n", `requests/cr.toml:6:9: the declaration names route "R9"`, "hint: correct the request; where it was right for a revision in between, name the requests that count with --request, or none\n"} {
		if !strings.Contains(got.errors, want) {
			t.Errorf("no %q in\n%s", want, got.errors)
		}
	}
	call(t, "--repo", dir, "assess", "--no-record", "--request", "none", "c0", "c1").want(t, statusDone)
}
