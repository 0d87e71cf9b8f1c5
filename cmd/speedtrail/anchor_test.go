package main

import (
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"
)

// Nobody is asked to sign an anchor, and no statement of one is written, that could
// not be recorded; and no ledger is made for it.
func TestAnchorRefusedBeforeAnybodyIsAsked(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	as := func(role, name string) []string { return []string{"--sign", role + "=" + filepath.Join(keys, name)} }
	statement := filepath.Join(t.TempDir(), "statement")
	write := func(role, name string) []string {
		return []string{"--write", statement, "--role", role, "--signer", name + "@tarn.example"}
	}
	testKey(t, keys, "eve")
	whole := slices.Concat(as("checker", "ada"), as("approver", "bea"), as("in-service", "cem"))
	refused := func(text string, args ...string) {
		t.Helper()
		// Without --yes and without a terminal, asking would be an error of its own.
		got := call(t, in(append([]string{"anchor", "c0", "--reason", "root"}, args...)...)...)
		if got.status != statusInput || !strings.Contains(got.errors, text) || strings.Contains(got.errors, "The statement:") {
			t.Errorf("%q: status %d\n%s", args, got.status, got.errors)
		}
		if _, err := os.Stat(statement); err == nil {
			t.Fatalf("%q: a statement was written", args)
		}
	}
	none := func() {
		t.Helper()
		for text, args := range map[string][]string{
			"the role in-service is signed by 0 of 1 people": whole[:4],
			"ada@tarn.example signs as checker and as":       slices.Concat(as("checker", "ada"), as("approver", "ada"), as("in-service", "cem")),
			"bea@tarn.example is no signer of the role":      slices.Concat(whole[:4], as("in-service", "bea")),
			"is not allowed to anyone":                       slices.Concat(whole[:4], as("in-service", "eve")),
			"a statement stands twice in the anchor":         slices.Concat(whole, as("checker", "ada")),
			`no role "cheker"`:                               write("cheker", "ada"),
			"eve@tarn.example is no person of the policy":    write("checker", "eve"),
			"ada@tarn.example is no signer of the role":      write("in-service", "ada"),
			"there is no terminal to ask on":                 whole,
		} {
			refused(text, args...)
		}
	}
	none()
	if _, err := os.Stat(filepath.Join(repo, ".git", "speedtrail")); err == nil {
		t.Fatal("a ledger was made")
	}
	got := call(t, in(append([]string{"anchor", "c0", "--reason", "root", "--yes"}, whole...)...)...).want(t, 0)
	if file := filepath.Join(repo, ".git", "speedtrail", "ledger.db"); !strings.Contains(got.errors, "a new ledger was made: "+file) {
		t.Errorf("no word of the new ledger: %s", got.errors)
	}
	refused("the folder . has an anchor already, entry 2", whole...)
	refused("the folder . has an anchor already, entry 2", write("checker", "ada")...)

	// A folder of its own is anchored by people whose keys were not revoked meanwhile.
	call(t, in("revoke", fingerprintOf(t, "ada"), "--role", "owner", "--reason", "stolen", "--key", filepath.Join(keys, "ada"), "-y")...).want(t, 0)
	for name, text := range plainFiles(t, keys, 90) {
		file := filepath.Join(repo, "other", filepath.FromSlash(name))
		if err := os.MkdirAll(filepath.Dir(file), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	gitIn(t, repo, "add", "other")
	gitIn(t, repo, "commit", "-q", "-m", "Other")
	gitIn(t, repo, "tag", "-f", "c0")
	refused("was revoked by entry 3: stolen", append(whole, "--data", "other")...)
	refused("was revoked by entry 3: stolen", append(write("checker", "ada"), "--data", "other")...)
}
