package main

import (
	"fmt"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// Whoever may add to the ledger can anchor a folder of his own, in the names of others
// and with keys of his own. Wherever these names are shown, it is said that the folder
// which was anchored before has no such keys of theirs.
func TestNamesOfAnotherFolder(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys, own := t.TempDir(), t.TempDir()
	var list []compose.Commit
	for i, speed := range []int{60, 80} {
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
	repo := filepath.Join(t.TempDir(), "repo")
	if err := compose.Write(t.Context(), repo, list); err != nil {
		t.Fatal(err)
	}
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
