package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// A commit that was recorded and then amended is in no other clone: verify leaves its
// assessment open there, as long as nobody has signed it.
func TestVerifyWithoutAmendedCommit(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60}, []time.Time{at})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	gitIn(t, repo, "checkout", "-q", "-B", "line", "c0")
	if err := os.WriteFile(filepath.Join(repo, "routes", "r1", "speed.csv"), []byte("from_km,to_km,basic\n0,1,100\n1,2,80\n2,5,100\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	gitIn(t, repo, "commit", "-q", "-a", "-m", "Raise")
	amended := gitIn(t, repo, "rev-parse", "HEAD")
	call(t, in("assess", "c0", "HEAD")...).want(t, 1)
	gitIn(t, repo, "commit", "-q", "--amend", "-m", "Raise, note 7")
	call(t, in("assess", "c0", "HEAD")...).want(t, 1)
	call(t, in("verify")...).want(t, 0)

	clone := filepath.Join(t.TempDir(), "clone")
	gitIn(t, t.TempDir(), "clone", "-q", "--no-local", "--branch", "line", repo, clone)
	verify := []string{"--repo", clone, "--ledger", filepath.Join(repo, ".git", "speedtrail", "ledger.db"), "verify"}
	words := func(c called) string { return strings.Join(strings.Fields(c.out), " ") }
	got := call(t, verify...).want(t, 0)
	for _, text := range []string{
		"Nothing is wrong.", "proved: 1 of 2 assessments were computed anew from Git",
		"left open: 1 assessment that nobody has signed: it could not be computed anew, because this repository lacks a commit (assessment 1, commit " + amended + "); fetch the branch or tag that holds it",
	} {
		if !strings.Contains(words(got), text) {
			t.Errorf("no %q in\n%s", text, got.out)
		}
	}
	call(t, append(verify[:4:4], "sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y")...).want(t, statusFailed)

	// A shallow clone lacks more, and that is what it says to do.
	shallow := filepath.Join(t.TempDir(), "shallow")
	gitIn(t, t.TempDir(), "clone", "-q", "--no-local", "--depth", "1", "--branch", "line", "file://"+filepath.ToSlash(repo), shallow)
	got = call(t, append([]string{"--repo", shallow}, verify[2:]...)...).want(t, statusFinding)
	if !strings.Contains(words(got), "left open: 2 assessments that nobody has signed") || !strings.Contains(words(got), "fetch the rest with `git fetch --unshallow`") {
		t.Errorf("%s", got.out)
	}

	// Signed, whatever the decision is, it has to be proved.
	call(t, in("sign", "1", "--role", "checker", "--decision", "reject", "--reason", "no", "--key", key("ada"), "-y")...).want(t, 0)
	got = call(t, verify...).want(t, statusFinding)
	if !strings.Contains(words(got), "! git: entry 3: the assessment cannot be computed anew, and it is signed, in entry 5: this repository lacks its target, commit "+amended+"; hint: fetch") {
		t.Errorf("%s", got.out)
	}
	for _, format := range []string{"text", "json"} {
		if got := call(t, append(verify, "--format", format)...); strings.Contains(got.out, `\nhint`) || strings.Contains(got.out, `\\n`) {
			t.Errorf("a line feed is shown: %s", got.out)
		}
	}
}
