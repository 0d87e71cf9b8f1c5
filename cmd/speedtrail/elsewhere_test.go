package main

import (
	"fmt"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// twoFolders writes commits of a data set, one a speed, with tags c0, c1, ..., and in the
// folder "mine" the same with keys of its own for the same people.
func twoFolders(t *testing.T, keys, own string, speeds []int, at time.Time) (repo string) {
	t.Helper()
	var list []compose.Commit
	for i, speed := range speeds {
		files := plainFiles(t, keys, speed)
		for name, content := range plainFiles(t, keys, speed) {
			files["mine/"+name] = content
		}
		signers := ""
		for _, name := range []string{"ada", "bea", "cem"} {
			_, public := testKey(t, own, "own-"+name)
			signers += name + "@tarn.example " + public + "\n"
		}
		files["mine/allowed_signers"] = signers
		c := compose.Commit{Files: files, Author: compose.Person{Name: "Cem Orr", Email: "cem@tarn.example"}, When: at.Add(time.Duration(i) * time.Hour), Message: "Commit\n", Tag: fmt.Sprintf("c%d", i), TagText: "Release\n"}
		if i > 0 {
			c.Parents = []int{i - 1}
		}
		list = append(list, c)
	}
	repo = filepath.Join(t.TempDir(), "repo")
	if err := compose.Write(t.Context(), repo, list); err != nil {
		t.Fatal(err)
	}
	return repo
}

// Whoever may add to the ledger can anchor a folder of his own, in the names of others
// and with keys of his own. Wherever these names are shown, it is said that the folder
// which was anchored before has no such keys of theirs.
func TestNamesOfAnotherFolder(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys, own := t.TempDir(), t.TempDir()
	repo := twoFolders(t, keys, own, []int{60, 80}, at)
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	mine := func(name string) string { return filepath.Join(own, "own-"+name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	call(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y")...).want(t, 0)
	call(t, in("sign", "1", "--role", "approver", "--decision", "approve", "--reason", "good", "--key", key("bea"), "-y")...).want(t, 0)

	call(t, in("anchor", "c0", "--data", "mine", "--sign", "checker="+mine("ada"), "--sign", "approver="+mine("bea"), "--sign", "in-service="+mine("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1", "--data", "mine")...).want(t, 1)
	call(t, in("sign", "2", "--data", "mine", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", mine("ada"), "-y")...).want(t, 0)
	call(t, in("sign", "2", "--data", "mine", "--role", "approver", "--decision", "approve", "--reason", "good", "--key", mine("bea"), "-y")...).want(t, 0)
	call(t, in("inforce", "record", "c1", "--data", "mine", "--since", "2026-03-04T00:00:00Z", "--reason", "next", "--key", mine("cem"), "-y")...).want(t, 0)

	for name, c := range map[string]struct {
		args   []string
		keys   int  // how often it is said of a key
		title  int  // and of a state
		folder bool // the folder has to be named
	}{
		"text":           {[]string{"report", "2"}, 2, 2, true},
		"html":           {[]string{"report", "2", "--format", "html"}, 2, 2, true},
		"markdown":       {[]string{"report", "2", "--format", "markdown"}, 2, 2, true},
		"json":           {[]string{"report", "2", "--format", "json"}, 0, 0, true},
		"text, first":    {[]string{"report", "1"}, 0, 0, false},
		"register":       {[]string{"register"}, 5, 0, true},
		"register, json": {[]string{"register", "--format", "json"}, 5, 0, true},
		"in force":       {[]string{"inforce", "--data", "mine"}, 3, 0, false},
		"then":           {[]string{"inforce", "--data", "mine", "--when", "2026-03-05T00:00:00Z"}, 6, 0, false},
		"trace":          {[]string{"trace", "c1", "--data", "mine", "--route", "R1", "--at", "1.5", "--direction", "nominal"}, 2, 0, false},
		"trace, csv":     {[]string{"trace", "c1", "--data", "mine", "--route", "R1", "--at", "1.5", "--direction", "nominal", "--format", "csv"}, 2, 0, false},
	} {
		out := strings.Join(strings.Fields(call(t, in(c.args...)...).out), " ")
		if n := strings.Count(out, "the folder ., anchored in entry 2, has no such key of this name"); n != c.keys {
			t.Errorf("%s: it is said of %d keys, not %d: %s", name, n, c.keys, out)
		}
		if n := strings.Count(out, "that an older folder of this ledger does not have for the name"); n != c.title {
			t.Errorf("%s: it is said of %d states, not %d: %s", name, n, c.title, out)
		}
		if c.folder && !strings.Contains(out, "mine") {
			t.Errorf("%s: the folder is not named: %s", name, out)
		}
	}
	if out := call(t, in("report", "2", "--format", "json")...).out; strings.Count(out, `"key_elsewhere": {`) != 2 {
		t.Errorf("json: %s", out)
	}
	if out := call(t, in("inforce", "--data", "mine", "--format", "json")...).out; strings.Count(out, `"key_elsewhere": {`) != 3 {
		t.Errorf("in force, json: %s", out)
	}
}

// Who anchors a folder of his own at a commit that nobody else has makes verify fail for
// nobody who asks by the root that he noted.
func TestVerifyWithoutCommitOfAnotherFolder(t *testing.T) {
	keys, own := t.TempDir(), t.TempDir()
	repo := twoFolders(t, keys, own, []int{60, 80, 90}, time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC))
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	mine := func(name string) string { return filepath.Join(own, "own-"+name) }
	root := func(args ...string) string {
		_, after, _ := strings.Cut(call(t, in(args...)...).want(t, 0).errors, "is in force; anchor ")
		return strings.Fields(after)[0]
	}
	first := root("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")
	second := root("anchor", "c1", "--data", "mine", "--sign", "checker="+mine("ada"), "--sign", "approver="+mine("bea"), "--sign", "in-service="+mine("cem"), "--reason", "root", "-y")
	call(t, in("assess", "c1", "c2", "--data", "mine")...).want(t, 1)
	call(t, in("sign", "1", "--data", "mine", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", mine("ada"), "-y")...).want(t, 0)
	call(t, in("inforce", "record", "c2", "--data", "mine", "--since", "2026-03-04T00:00:00Z", "--reason", "next", "--key", mine("cem"), "-y")...).want(t, 0)
	call(t, in("verify", "--anchor", first)...).want(t, 0)

	clone := filepath.Join(t.TempDir(), "clone")
	gitIn(t, t.TempDir(), "clone", "-q", "--no-local", "--single-branch", "--branch", "c0", repo, clone)
	verify := []string{"--repo", clone, "--ledger", filepath.Join(repo, ".git", "speedtrail", "ledger.db"), "verify"}
	got := call(t, append(verify, "--anchor", first)...).want(t, 0)
	words := strings.Join(strings.Fields(got.out), " ")
	c1, c2 := gitIn(t, repo, "rev-parse", "c1^{}"), gitIn(t, repo, "rev-parse", "c2^{}")
	if !strings.Contains(words, "left open: what is recorded of the folder mine, whose policy root is none of those that are given: this repository lacks commits that it names (entry 3, commit "+c1+"; entry 4, commit "+c1+"; entry 6, commit "+c2+")") {
		t.Errorf("%s", got.out)
	}
	// Who asks by no root asks about everything, and who gives that one about it, too.
	call(t, verify...).want(t, statusFinding)
	call(t, append(verify, "--anchor", first, "--anchor", second)...).want(t, statusFinding)
}
