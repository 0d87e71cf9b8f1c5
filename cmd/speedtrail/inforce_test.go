package main

import (
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// An entry that does not count is something against it, in every format.
func TestInForceDoesNotCount(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", key("cem"), "-y")...).want(t, 0)
	call(t, in("inforce")...).want(t, 0)
	l, err := ledger.Open(t.Context(), filepath.Join(repo, ".git", "speedtrail", "ledger.db"), ledger.Options{})
	if err != nil {
		t.Fatal(err)
	}
	_, err = l.Append(t.Context(), time.Now(), chain.InForce, func() ([]byte, []ledger.Row, error) { return []byte("{}"), nil, nil })
	l.Close()
	if err != nil {
		t.Fatal(err)
	}
	if got := call(t, in("inforce")...); !strings.HasSuffix(got.out, "  Ask who added the entry, and past which check; what it says has no effect.\n") {
		t.Errorf("no advice: %s", got.out)
	}
	for format, want := range map[string]string{"text": "! does-not-count: entry 4 (in-force): refused:", "json": `"id": "does-not-count"`} {
		if got := call(t, in("inforce", "--format", format)...).want(t, statusFinding); !strings.Contains(got.out, want) {
			t.Errorf("%s: %s", format, got.out)
		}
	}
	// Whatever else is shown of the line of approval is shown without it.
	call(t, in("assess", "c0", "c1")...).want(t, statusFinding)
	for _, args := range [][]string{
		{"register"}, {"report", "1"}, {"inforce", "--when", "2026-03-04T00:00:00Z"}, {"assess", "c0", "c1"}, {"revoke", "SHA256:none", "--role", "owner", "--reason", "none", "--key", key("ada"), "-y"},
		{"sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--signer", "ada@tarn.example", "--write", filepath.Join(t.TempDir(), "statement")},
	} {
		if got := call(t, in(args...)...); strings.Count(got.errors, "! it does not count, speedtrail --repo "+repo+" verify says more: entry 4 (in-force): refused:") != 1 {
			t.Errorf("%q: %s", args, got.errors)
		}
	}
}

// What a record said of an instant is told with the answer, after another one has
// taken its place.
func TestInForceWhenCorrected(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	record := func(rev, since string, more ...string) {
		t.Helper()
		call(t, in(append([]string{"inforce", "record", rev, "--since", since, "--reason", "start", "--key", key("cem"), "-y"}, more...)...)...).want(t, 0)
	}
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	record("c0", "2026-03-02T00:00:00Z")
	record("c1", "2026-03-04T00:00:00Z", "--routes", "R1")
	record("c1", "2026-03-08T00:00:00Z", "--replaces", "4")
	// c1 is not approved: status 1 where it was in force, and where that was said once.
	for when, want := range map[string]bool{"2026-03-03T00:00:00Z": false, "2026-03-05T00:00:00Z": true, "2026-03-09T00:00:00Z": false} {
		status := statusFinding
		if when == "2026-03-03T00:00:00Z" {
			status = statusDone
		}
		for _, route := range [][]string{nil, {"--route", "R1", "--at", "1.5"}} {
			args := append([]string{"inforce", "--when", when}, route...)
			text, form := call(t, in(args...)...).want(t, status), call(t, in(append(args, "--format", "json")...)...).want(t, status)
			if strings.Contains(strings.Join(strings.Fields(text.out), " "), "Said otherwise, and not any more: 2026-03-04T00:00:00Z commit") != want || strings.Contains(form.out, `"by_entry": 5`) != want {
				t.Errorf("%q: want %v\n%s%s", args, want, text.out, form.out)
			}
		}
	}
}
