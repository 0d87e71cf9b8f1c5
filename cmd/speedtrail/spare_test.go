package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// No result is written over the ledger, the index, or what lies beside them, by
// whatever name; and nothing is done before that is said.
func TestLedgerIsNotWrittenOver(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80, 100}, []time.Time{at, at.Add(time.Hour), at.Add(2 * time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	folder := filepath.Join(repo, ".git", "speedtrail")
	file, other := filepath.Join(folder, "ledger.db"), filepath.Join(t.TempDir(), "other.db")
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	refused := func(args ...string) {
		t.Helper()
		got := call(t, in(args...)...)
		if got.status != statusInput || !strings.Contains(got.errors, "over the ledger") || !strings.Contains(got.errors, "hint: name another file") {
			t.Errorf("%q: status %d\n%s%s", args, got.status, got.out, got.errors)
		}
	}
	// There is none yet, not even its folder: the call would make it first.
	refused("assess", "c0", "c1", "--format", "json", "--out", file)
	if _, err := os.Stat(folder); err == nil {
		t.Fatal("a refused call has made a ledger")
	}
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	call(t, in("trace", "c1", "--route", "R1", "--at", "1.5")...).want(t, 0)
	call(t, in("assess", "c0", "c1", "--ledger", other)...).want(t, 1)
	before := map[string][]byte{}
	for _, name := range []string{file, filepath.Join(folder, "index.db"), other} {
		before[name] = readFileOf(t, name)
	}
	for _, target := range []string{file, filepath.Join(folder, "ledger.db-journal"), filepath.Join(folder, "index.db"), filepath.Join(repo, "routes", "..", ".git", "speedtrail", "ledger.db")} {
		refused("assess", "c1", "c2", "--format", "json", "--out", target)
		refused("report", "1", "--format", "json", "-o", target)
		refused("register", "--format", "json", "--out", target)
		refused("export", "--out", target)
		refused("export", "--ledger", other, "--out", target)
		refused("sign", "1", "--role", "approver", "--decision", "approve", "--reason", "r", "--signer", "bea@tarn.example", "--write", target)
		refused("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "r", "--key", key("cem"), "-y", "--write", target)
		refused("revoke", "SHA256:x", "--role", "owner", "--reason", "r", "--key", key("ada"), "-y", "--write", target)
		refused("anchor", "c0", "--role", "checker", "--signer", "ada@tarn.example", "--reason", "r", "--write", target)
	}
	refused("export", "--ledger", other, "--out", other)
	signature := filepath.Join(t.TempDir(), "st.sig")
	if err := os.Symlink(file, signature); err == nil {
		refused("sign", "1", "--role", "approver", "--decision", "approve", "--reason", "r", "--key", key("bea"), "-y", "--write", strings.TrimSuffix(signature, ".sig"))
		refused("export", "--out", signature)
	}
	for name, content := range before {
		if !bytes.Equal(readFileOf(t, name), content) {
			t.Errorf("%s was altered", name)
		}
	}
	call(t, in("export", "--out", filepath.Join(folder, "ledger.jsonl"))...).want(t, 0)
}

// A statement takes the place of what was there when it is whole.
func TestStatementIsWrittenWhole(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	dir := t.TempDir()
	file, held := filepath.Join(dir, "statement"), filepath.Join(dir, "held")
	if err := os.WriteFile(file, []byte("before\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	// Who has the file under another name, or open, keeps what was in it.
	if err := os.Link(file, held); err != nil {
		t.Skip(err)
	}
	call(t, "--repo", repo, "anchor", "c0", "--role", "checker", "--signer", "ada@tarn.example", "--reason", "root", "--write", file).want(t, 0)
	if got := string(readFileOf(t, held)); got != "before\n" {
		t.Errorf("the file was written into: %q", got)
	}
	if got := string(readFileOf(t, file)); !strings.Contains(got, "ada@tarn.example") {
		t.Errorf("%q", got)
	}
}
