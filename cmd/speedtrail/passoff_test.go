package main

import (
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"speedtrail/history"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// A shallow clone does not know who prepared the change: nothing is recorded or
// signed from it, and verify does not call proved what it cannot compute.
func TestShallowCloneHidesNoPreparer(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	full := composed(t, keys, []int{60, 70, 80, 90}, []time.Time{at, at.Add(time.Hour), at.Add(2 * time.Hour), at.Add(3 * time.Hour)})
	// A branch of two commits is merged: with two commits of depth, its first one is
	// beyond the end, and its base is not.
	git := func(dir string, args ...string) { gitIn(t, dir, args...) }
	git(full, "checkout", "-q", "-b", "side", "c2")
	for _, v := range []string{"75", "85"} {
		if err := os.WriteFile(filepath.Join(full, "routes", "r1", "speed.csv"), []byte("from_km,to_km,basic\n0,1,100\n1,2,"+v+"\n2,5,100\n"), 0o600); err != nil {
			t.Fatal(err)
		}
		git(full, "commit", "-q", "-a", "-m", "Side "+v)
	}
	git(full, "checkout", "-q", "-B", "line", "c2")
	git(full, "merge", "-q", "--no-ff", "-m", "Merge", "side")
	git(full, "tag", "merged")
	shallow := filepath.Join(t.TempDir(), "shallow")
	git(t.TempDir(), "clone", "-q", "--depth", "2", "--branch", "merged", "file://"+filepath.ToSlash(full), shallow)
	base := "merged^1"
	call(t, "--repo", full, "assess", base, "merged").want(t, 1)
	for _, args := range [][]string{{"assess", base, "merged"}, {"assess", base, "merged", "--ledger", filepath.Join(full, ".git", "speedtrail", "ledger.db")}} {
		got := call(t, append([]string{"--repo", shallow}, args...)...)
		if got.status != statusInput || !strings.Contains(got.errors, "who prepared the change cannot be known") {
			t.Errorf("%q: status %d\n%s", args, got.status, got.errors)
		}
	}
	if _, err := os.Stat(filepath.Join(shallow, ".git", "speedtrail", "ledger.db")); err == nil {
		t.Error("a ledger was made")
	}
	if got := call(t, "--repo", shallow, "assess", base, "merged", "--no-record"); got.status != statusFinding || !strings.Contains(got.errors, "the clone is shallow") {
		t.Errorf("--no-record: status %d\n%s", got.status, got.errors)
	}
	// The clone of a pipeline: one commit of each, with nothing between them.
	apart := filepath.Join(t.TempDir(), "apart")
	git(t.TempDir(), "clone", "-q", "--depth", "1", "--branch", "merged", "file://"+filepath.ToSlash(full), apart)
	git(apart, "fetch", "-q", "--depth", "1", "origin", "tag", "c0")
	if got := call(t, "--repo", apart, "assess", "c0", "merged"); got.status != statusInput || !strings.Contains(got.errors, "who prepared the change cannot be known") {
		t.Errorf("apart: status %d\n%s", got.status, got.errors)
	}
	for _, target := range []string{"merged", "."} {
		got := call(t, "--repo", apart, "assess", "c0", target, "--no-record")
		if got.status != statusFinding || !strings.Contains(got.errors, "the clone is shallow") || strings.Contains(got.out, "base-not-ancestor") || !strings.Contains(got.out, "R1") {
			t.Errorf("apart, %s: status %d\n%s%s", target, got.status, got.errors, got.out)
		}
	}
	got := call(t, "--repo", shallow, "verify", "--ledger", filepath.Join(full, ".git", "speedtrail", "ledger.db"))
	if got.status != statusFinding || !strings.Contains(got.out, "cannot be computed anew: the clone is shallow") {
		t.Errorf("verify: status %d\n%s%s", got.status, got.out, got.errors)
	}
}

// What is brought back signed is held against Git and against the call.
func TestStatementsThatAreBrought(t *testing.T) {
	program, err := exec.LookPath("ssh-keygen")
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("the ssh-keygen program is not installed")
	}
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	hash := func(rev string) string {
		t.Helper()
		return gitIn(t, repo, "rev-parse", rev)
	}
	// written has a statement written, altered and signed elsewhere.
	written := func(name, signer string, replace [2]string, args ...string) string {
		t.Helper()
		file := filepath.Join(t.TempDir(), name)
		call(t, in(append(args, "--write", file)...)...).want(t, 0)
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		altered := strings.ReplaceAll(string(text), replace[0], replace[1])
		if replace[0] != "" && altered == string(text) {
			t.Fatalf("%q does not stand in\n%s", replace[0], text)
		}
		if err := os.WriteFile(file, []byte(altered), 0o600); err != nil {
			t.Fatal(err)
		}
		if out, err := exec.Command(program, "-Y", "sign", "-f", key(signer), "-n", "speedtrail-signoff", file).CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, out)
		}
		return file
	}
	refused := func(what string, got called, text string) {
		t.Helper()
		if got.status != statusInput || !strings.Contains(got.errors, text) || !strings.Contains(got.errors, "nothing was recorded") {
			t.Errorf("%s: status %d\n%s", what, got.status, got.errors)
		}
	}
	tree0, tree1 := hash("c0^{tree}"), hash("c1^{tree}")
	anchor := func(replace [2]string) []string {
		args := in("anchor", "c0")
		for role, who := range map[string]string{"checker": "ada", "approver": "bea", "in-service": "cem"} {
			args = append(args, "--bring", written(role, who, replace, "anchor", "c0", "--role", role, "--signer", who+"@tarn.example", "--reason", "root"))
		}
		return args
	}
	refused("an anchor on another content", call(t, anchor([2]string{tree0, tree1})...), "the statement is about the content")
	refused("an anchor on another commit", call(t, anchor([2]string{hash("c0^{commit}"), hash("c1^{commit}")})...), "the statement is about the commit")
	call(t, anchor([2]string{})...).want(t, 0)

	record := []string{"inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--signer", "cem@tarn.example"}
	for what, replace := range map[string][2]string{
		"another commit":            {hash("c0^{commit}"), hash("c1^{commit}")},
		"a tag in place of commit":  {hash("c0^{commit}"), hash("c0")},
		"another content":           {tree0, tree1},
		"a route that is not there": {"routes: all", "routes: R9"},
	} {
		file := written("inforce", "cem", replace, record...)
		refused(what, call(t, in("inforce", "record", "c0", "--statement", file, "--signature", file+".sig")...), "the statement")
	}
	file := written("inforce", "cem", [2]string{}, record...)
	call(t, in("inforce", "record", "c0", "--statement", file, "--signature", file+".sig")...).want(t, 0)
	if got := call(t, in("inforce", "record", "c0", "--since", "2026-03-04T00:00:00Z", "--routes", "", "--reason", "x", "--key", key("cem"), "-y")...); got.status != statusInput || !strings.Contains(got.errors, "names no route") {
		t.Errorf("an empty list of routes: status %d\n%s", got.status, got.errors)
	}

	// What came into the ledger by another way names an approved content and a commit
	// of another: its speeds are not shown as approved ones.
	file = written("foreign", "cem", [2]string{hash("c0^{commit}"), hash("c1^{commit}")}, append(slices.Clone(record[:4]), "2026-03-05T00:00:00Z", "--reason", "start", "--signer", "cem@tarn.example")...)
	l, err := ledger.Open(t.Context(), filepath.Join(repo, ".git", "speedtrail", "ledger.db"), ledger.Options{})
	if err != nil {
		t.Fatal(err)
	}
	statement, signature := readFileOf(t, file), readFileOf(t, file+".sig")
	if _, err := history.RecordSigned(t.Context(), l, nil, history.Statement{Kind: chain.InForce, Text: statement, Signature: signature}, time.Now()); err != nil {
		t.Fatal(err)
	}
	l.Close()
	call(t, in("inforce", "--when", "2026-03-04T00:00:00Z", "--route", "R1", "--at", "1")...).want(t, 0)
	if got := call(t, in("inforce", "--when", "2026-03-06T00:00:00Z", "--route", "R1", "--at", "1")...); got.status != statusFailed || !strings.Contains(got.errors, "has the content "+tree0+", in Git it has "+tree1) || strings.Contains(got.out, "km/h") {
		t.Errorf("a commit of another content: status %d\n%s%s", got.status, got.out, got.errors)
	}
}

// A call that is refused makes no ledger, and a faulty data set no root of approval.
func TestRefusedLeavesNoLedger(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 63}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	for _, args := range [][]string{
		{"sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y"},
		{"revoke", "SHA256:x", "--role", "owner", "--reason", "lost", "--key", key("ada"), "-y"},
		{"inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", key("cem"), "-y"},
		{"anchor", "c1", "--sign", "checker=" + key("ada"), "--sign", "approver=" + key("bea"), "--sign", "in-service=" + key("cem"), "--reason", "root", "-y"},
	} {
		if got := call(t, in(args...)...); got.status == 0 {
			t.Errorf("%q: status 0\n%s%s", args, got.out, got.errors)
		}
		if _, err := os.Stat(filepath.Join(repo, ".git", "speedtrail", "ledger.db")); err == nil {
			t.Fatalf("%q has made a ledger", args)
		}
	}
	got := call(t, in("anchor", "c1", "--sign", "checker="+key("ada"), "--reason", "root", "-y")...)
	if got.status != statusInput || !strings.Contains(got.errors, `"63" is not`) {
		t.Errorf("a faulty data set is anchored: status %d\n%s", got.status, got.errors)
	}
}

// What would be refused is refused before anybody is asked to sign it.
func TestRefusedBeforeSigning(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80, 100}, []time.Time{at, at.Add(time.Hour), at.Add(2 * time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	call(t, in("assess", "c1", "c2")...).want(t, 1)
	for text, args := range map[string][]string{
		"base-not-approved":   {"sign", "2", "--role", "checker", "--key", key("ada")},
		`no role "aprover"`:   {"sign", "1", "--role", "aprover", "--key", key("ada")},
		"prepared the change": {"sign", "1", "--role", "checker", "--key", key("cem")},
	} {
		// Without --yes and without a terminal, asking would be an error of its own.
		got := call(t, in(append(args, "--decision", "approve", "--reason", "seen")...)...)
		if got.status != statusInput || !strings.Contains(got.errors, text) || strings.Contains(got.errors, "The statement:") || strings.Contains(got.errors, "no terminal to ask") {
			t.Errorf("%q: status %d\n%s", args, got.status, got.errors)
		}
	}
}

// Beside a statement that is brought, no option says what it says.
func TestNothingBesideAStatement(t *testing.T) {
	for _, args := range [][]string{
		{"sign", "1", "--decision", "reject"}, {"sign", "1", "--role", "approver"}, {"sign", "1", "--reason", "x"},
		{"inforce", "record", "c0", "--since", "2031-01-01T00:00:00Z"}, {"inforce", "record", "c0", "--routes", "R1"}, {"inforce", "record", "c0", "--voids", "3"},
		{"revoke", "SHA256:x", "--role", "owner"},
	} {
		got := call(t, append(args, "--statement", "s", "--signature", "s.sig")...)
		if got.status != statusInput || !strings.Contains(got.errors, "does not go with --statement") {
			t.Errorf("%q: status %d\n%s", args, got.status, got.errors)
		}
	}
}
