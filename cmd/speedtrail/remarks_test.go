package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// What a person is told beside the result: what went before, what looks wrong, and
// what to do about a call that cannot be meant so.
func TestRemarks(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)

	got := call(t, in("inforce", "record", "c0", "--since", "2126-03-03T00:00:00Z", "--reason", "start", "--key", key("cem"), "-y")...)
	if got.status != 0 || !strings.Contains(got.errors, "2126-03-03T00:00:00Z lies in the future") {
		t.Errorf("in force from a future instant on: status %d\n%s", got.status, got.errors)
	}

	call(t, in("assess", "c0", "c1")...).want(t, 1)
	sign := in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y")
	if got := call(t, sign...); got.status != 0 || strings.Contains(got.errors, "already") {
		t.Errorf("signed once: status %d\n%s", got.status, got.errors)
	}
	if got := call(t, sign...); !strings.Contains(got.errors, "ada@tarn.example has signed as checker already, in entry 5: approve; the later decision counts") {
		t.Errorf("signed again: status %d\n%s", got.status, got.errors)
	}

	got = call(t, in("verify", "--anchor", "00")...)
	if got.status != statusInput || !strings.Contains(got.errors, `"00" is no hash`) {
		t.Errorf("a hash that is none: status %d\n%s", got.status, got.errors)
	}

	// A mistyped name of a ledger is not taken for a wish to have another one.
	elsewhere := t.TempDir()
	got = call(t, in("assess", "c0", "c1", "--ledger", filepath.Join(elsewhere, "absent", "ledger.db"))...)
	if got.status != statusInput || !strings.Contains(got.errors, "is not there, nor is its folder") {
		t.Errorf("a ledger in no folder: status %d\n%s", got.status, got.errors)
	}
	got = call(t, in("assess", "c0", "c1", "--ledger", filepath.Join(elsewhere, "ledgr.db"))...)
	if got.status != statusFinding || !strings.Contains(got.errors, "a new ledger was made: ") {
		t.Errorf("a new ledger: status %d\n%s", got.status, got.errors)
	}

	out := filepath.Join(t.TempDir(), "absent", "report.html")
	got = call(t, in("report", "1", "--out", out)...)
	if got.status == 0 || !strings.Contains(got.errors, fmt.Sprintf("folder %q", filepath.Dir(out))) || strings.Contains(got.errors, ".report.html") {
		t.Errorf("a folder that is not there: status %d\n%s", got.status, got.errors)
	}
	// What to do with an export is said of one that was written.
	for folder, status := range map[string]int{filepath.Dir(out): statusFailed, t.TempDir(): statusDone} {
		got = call(t, in("export", "1", "--out", filepath.Join(folder, "bundle.jsonl"))...)
		if got.status != status || strings.Contains(got.errors, "the signer:") != (status == statusDone) {
			t.Errorf("export to %s: status %d\n%s", folder, got.status, got.errors)
		}
	}
}

// A correction of what cannot be an entry is not taken for none.
func TestCorrectionOfNoEntry(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	record := in("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", key("cem"), "-y")
	call(t, record...).want(t, 0)
	for _, c := range []struct {
		text string
		args []string
	}{
		{"--voids -3 is", []string{"--voids", "-3"}}, {"--voids 0 is", []string{"--voids", "0"}},
		{"--replaces -1 is", []string{"--replaces=-1"}}, {"--replaces 0 is", []string{"--replaces", "0"}},
		{"both given", []string{"--replaces", "3", "--voids", "0"}},
	} {
		if got := call(t, append(record, c.args...)...); got.status != statusInput || !strings.Contains(got.errors, c.text) || !strings.Contains(got.errors, "hint:") {
			t.Errorf("%q: status %d\n%s", c.args, got.status, got.errors)
		}
	}
	if got := call(t, in("verify")...).want(t, 0); !strings.Contains(got.out, "head 3:") {
		t.Errorf("something was recorded: %s", got.out)
	}
	call(t, append(record, "--replaces", "3")...).want(t, 0)
}

// An export that an editor has given a blank line at its end is one.
func TestBlankLineInExport(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, t.TempDir(), []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	call(t, "--repo", repo, "assess", "c0", "c1").want(t, 1)
	file, copied := filepath.Join(t.TempDir(), "export.jsonl"), filepath.Join(t.TempDir(), "copy.db")
	if err := os.WriteFile(file, []byte(call(t, "--repo", repo, "export").out+"\n \n"), 0o600); err != nil {
		t.Fatal(err)
	}
	call(t, "--repo", repo, "import", file, "--ledger", copied).want(t, 0)
	if a, b := call(t, "--repo", repo, "export").out, call(t, "--repo", repo, "export", "--ledger", copied).out; a != b || a == "" {
		t.Errorf("%q was imported as %q", a, b)
	}
}

// A position among missing posts names the jump.
func TestPositionAmongMissingPosts(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, t.TempDir(), []int{80}, []time.Time{at})
	for name, content := range map[string]string{
		"route.toml": "id = \"R1\"\nname = \"Route\"\nstart_km = 0\nend_km = 5\n\n[[jump]]\narriving_km = 2.0\nleaving_km = 2.4\n",
		"speed.csv":  "from_km,to_km,basic\n0,2.2,50\n2.4,5,100\n",
	} {
		if err := os.WriteFile(filepath.Join(repo, "routes", "r1", name), []byte(content), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	got := call(t, "--repo", repo, "validate")
	if !strings.Contains(got.out+got.errors, "among the missing posts of a chainage jump: from 2.000 the posts go on at 2.400") {
		t.Errorf("status %d\n%s%s", got.status, got.out, got.errors)
	}
}

// A data set that lies in a folder of the repository is found where --data is
// missing.
func TestDataSetElsewhere(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	files := map[string]string{"README": "x\n"}
	for name, content := range plainFiles(t, t.TempDir(), 80) {
		files["net/lines/"+name] = content
	}
	repo := filepath.Join(t.TempDir(), "repo")
	who := compose.Person{Name: "Cem Orr", Email: "cem@tarn.example"}
	if err := compose.Write(t.Context(), repo, []compose.Commit{{Files: files, Author: who, When: at, Message: "One\n"}}); err != nil {
		t.Fatal(err)
	}
	for _, args := range [][]string{{"validate"}, {"validate", "HEAD"}, {"assess", "HEAD", "HEAD"}, {"profile", "--route", "R1", "--train", "T"}} {
		got := call(t, append([]string{"--repo", repo}, args...)...)
		if got.status != statusInput || !strings.Contains(got.errors, "has no data set in the folder .") || !strings.Contains(got.errors, "--data net/lines") {
			t.Errorf("%q: status %d\n%s%s", args, got.status, got.out, got.errors)
		}
	}
	call(t, "--repo", repo, "--data", "net/lines", "validate").want(t, 0)
}
