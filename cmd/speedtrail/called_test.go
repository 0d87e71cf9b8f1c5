package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// TestCalledOtherwise: no digest covers how the revisions of an assessment were called.
// Where a name means another commit to the signer, he is told before he signs.
func TestCalledOtherwise(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, "--repo", repo, "anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y").want(t, 0)
	call(t, "--repo", repo, "assess", "c0", "c1").want(t, 1)
	sign := func(want ...string) {
		t.Helper()
		got := call(t, "--repo", repo, "sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--signer", "ada@tarn.example", "--write", filepath.Join(t.TempDir(), "statement"))
		got.want(t, 0)
		text := strings.Join(strings.Fields(got.errors), " ")
		if strings.Contains(text, "the assessment calls its") != (len(want) > 0) {
			t.Errorf("want %q\n%s", want, got.errors)
		}
		for _, w := range want {
			if !strings.Contains(text, w) {
				t.Errorf("%q is missing\n%s", w, got.errors)
			}
		}
	}
	sign()
	file := func(name string) string { return filepath.Join(repo, ".git", "refs", "tags", name) }
	if err := os.WriteFile(file("c1"), []byte(readFileOf(t, file("c0"))), 0o644); err != nil {
		t.Fatal(err)
	}
	sign("! the assessment calls its target c1, which in this repository is the commit ")
	if err := os.Remove(file("c0")); err != nil {
		t.Fatal(err)
	}
	sign("! the assessment calls its base c0, which this repository does not know", "calls its target c1, which in this")
}

// TestOddTime: the time by which an assessment judges is a claim of whoever committed.
func TestOddTime(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	for name, c := range map[string]struct {
		target time.Time
		want   string
	}{
		"after the base":  {at.Add(time.Hour), ""},
		"of the same":     {at, ""},
		"before the base": {at.Add(-time.Second), "of 2026-03-01T11:59:59Z, before its base of 2026-03-01T12:00:00Z: by it the terms of acceptances"},
		"to come":         {time.Now().AddDate(1, 0, 0), ", which is to come: by it the terms of acceptances"},
	} {
		keys := t.TempDir()
		repo := composed(t, keys, []int{60, 80}, []time.Time{at, c.target})
		key := func(name string) string { return filepath.Join(keys, name) }
		call(t, "--repo", repo, "anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y").want(t, 0)
		call(t, "--repo", repo, "assess", "c0", "c1").want(t, 1)
		got := call(t, "--repo", repo, "sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--signer", "ada@tarn.example", "--write", filepath.Join(t.TempDir(), "statement")).want(t, 0)
		text := strings.Join(strings.Fields(got.errors), " ")
		if strings.Contains(text, "the target's commit says") != (c.want != "") || !strings.Contains(text, c.want) {
			t.Errorf("%s\n%s", name, got.errors)
		}
	}
}

// TestRequestsChosen: that somebody chose the requests that declare a change is told to
// whoever signs it.
func TestRequestsChosen(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, "--repo", repo, "anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y").want(t, 0)
	call(t, "--repo", repo, "assess", "c0", "c1").want(t, 1)
	call(t, "--repo", repo, "assess", "c0", "c1", "--request", "CR").want(t, 1)
	for number, want := range map[string]bool{"1": false, "2": true} {
		got := call(t, "--repo", repo, "sign", number, "--role", "checker", "--decision", "approve", "--reason", "seen", "--signer", "ada@tarn.example", "--write", filepath.Join(t.TempDir(), "statement")).want(t, 0)
		if strings.Contains(strings.Join(strings.Fields(got.errors), " "), "chose the requests that count (--request CR)") != want {
			t.Errorf("assessment %s: want %v\n%s", number, want, got.errors)
		}
	}
}

// TestPolicyShown: of an anchor the statement holds a hash; what it is the hash of is
// told beside it.
func TestPolicyShown(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60}, []time.Time{at})
	key := func(name string) string { return filepath.Join(keys, name) }
	for _, args := range [][]string{
		{"--write", filepath.Join(t.TempDir(), "statement"), "--role", "checker", "--signer", "ada@tarn.example"},
		{"--sign", "checker=" + key("ada"), "--sign", "approver=" + key("bea"), "--sign", "in-service=" + key("cem"), "-y"},
	} {
		got := call(t, append([]string{"--repo", repo, "anchor", "c0", "--reason", "root"}, args...)...).want(t, 0)
		shown, _, _ := strings.Cut(got.errors, "The statement:")
		for _, want := range []string{"The policy:\n", "  role checker: needed 1, of any person, independent of preparer\n", "  person ada@tarn.example: ada@tarn.example", "  key SHA256:", " of ada@tarn.example\n"} {
			if !strings.Contains(shown, want) {
				t.Errorf("%q is missing\n%s", want, got.errors)
			}
		}
	}
}

// TestStatementShown: what is signed is shown with every mark that a terminal does not
// show.
func TestStatementShown(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60}, []time.Time{at})
	got := call(t, "--repo", repo, "anchor", "c0", "--write", filepath.Join(t.TempDir(), "statement"), "--role", "checker", "--signer", "ada@tarn.example", "--reason", "ro\u200bot").want(t, 0)
	if !strings.Contains(got.errors, `reason: ro\u200bot`+"\n") || strings.Contains(got.errors, "\u200b") {
		t.Errorf("%q", got.errors)
	}
}
