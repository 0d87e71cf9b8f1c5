package main

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
)

// What takes a record back says what the record says: it is enough to name it, and
// nothing else can be named.
func TestVoidSaysWhatIsVoided(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	record := func(args ...string) []string {
		return in(append([]string{"inforce", "record", "--reason", "put off", "--key", key("cem"), "-y"}, args...)...)
	}
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, record("c0", "--since", "2026-03-03T00:00:00Z")...).want(t, 0)
	call(t, record("c1", "--since", "2031-04-01T03:00:00+01:00", "--routes", "R1")...).want(t, 0)

	for text, args := range map[string][]string{
		"REV is missing":       {"--since", "2026-03-04T00:00:00Z"},
		"--since":              {"c1"},
		"is about the commit ": {"c0", "--voids", "4"},
		"is about the instant 2031-04-01T02:00:00Z, not 2031-04-01T03:00:00Z": {"c1", "--voids", "4", "--since", "2031-04-01T03:00:00Z"},
		"is about the routes all, not R1":                                     {"--voids", "3", "--routes", "R1"},
		"entry 5 is no in-force record that stands":                           {"--voids", "5"},
		"entry 2 is no in-force record that stands":                           {"--voids", "2"},
		"unknown revision": {"c9", "--voids", "4"},
	} {
		if got := call(t, record(args...)...); got.status != statusInput || !strings.Contains(got.errors, text) || strings.Contains(got.errors, "The statement:") {
			t.Errorf("%q: status %d\n%s", args, got.status, got.errors)
		}
	}

	// A statement that was altered on its way back is refused as well, but one that is in
	// a ledger already still counts.
	if program, err := exec.LookPath("ssh-keygen"); err == nil {
		file := filepath.Join(t.TempDir(), "statement")
		call(t, in("inforce", "record", "--voids", "4", "--reason", "put off", "--signer", "cem@tarn.example", "--write", file)...).want(t, 0)
		whole := string(readFileOf(t, file))
		if !strings.Contains(whole, "\nroutes: R1\nsince: 2031-04-01T02:00:00Z\ncorrects: voids 4\n") || !strings.Contains(whole, "\nrevision: "+gitIn(t, repo, "rev-parse", "c1^{commit}")+"\n") {
			t.Errorf("the statement: %s", whole)
		}
		brought := in("inforce", "record", "--statement", file, "--signature", file+".sig")
		for _, replace := range [][2]string{{gitIn(t, repo, "rev-parse", "c1^{commit}"), gitIn(t, repo, "rev-parse", "c0^{commit}")}, {"since: 2031", "since: 2030"}, {"routes: R1", "routes: all"}} {
			if err := os.WriteFile(file, []byte(strings.Replace(whole, replace[0], replace[1], 1)), 0o600); err != nil {
				t.Fatal(err)
			}
			os.Remove(file + ".sig")
			if out, err := exec.Command(program, "-Y", "sign", "-f", key("cem"), "-n", "speedtrail-signoff", file).CombinedOutput(); err != nil {
				t.Fatalf("%v: %s", err, out)
			}
			if got := call(t, brought...); got.status != statusInput || !strings.Contains(got.errors, "entry 4, which is to be voided, is about") {
				t.Errorf("%q: status %d\n%s", replace, got.status, got.errors)
			}
		}
		old := filepath.Join(t.TempDir(), "old.db")
		if err := os.WriteFile(old, readFileOf(t, filepath.Join(repo, ".git", "speedtrail", "ledger.db")), 0o600); err != nil {
			t.Fatal(err)
		}
		l, err := ledger.Open(t.Context(), old, ledger.Options{})
		if err != nil {
			t.Fatal(err)
		}
		_, err = history.RecordSigned(t.Context(), l, nil, history.Statement{Kind: chain.InForce, Text: readFileOf(t, file), Signature: readFileOf(t, file+".sig")}, time.Now())
		l.Close()
		if err != nil {
			t.Fatal(err)
		}
		call(t, in("verify", "--ledger", old)...).want(t, 0)
	}

	got := call(t, record("--voids", "4")...).want(t, 0)
	if strings.Contains(got.errors, "lies in the future") || !strings.Contains(got.errors, "it takes back entry 4: 2031-04-01T02:00:00Z  commit") || !strings.Contains(got.errors, "\nroutes: R1\nsince: 2031-04-01T02:00:00Z\ncorrects: voids 4\n") {
		t.Errorf("%s", got.errors)
	}
	call(t, record("c0", "--voids", "3", "--since", "2026-03-03T01:00:00+01:00")...).want(t, 0)
	if got := call(t, in("inforce")...); !strings.Contains(got.out, "No revision is recorded as in service") {
		t.Errorf("%s", got.out)
	}
}
