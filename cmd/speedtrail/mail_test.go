package main

import (
	"encoding/base64"
	"html"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"time"
)

// What comes through mail with other line ends is refused with what to do; that makes
// the files again that were signed.
func TestLineEndsOfMail(t *testing.T) {
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
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	file := filepath.Join(t.TempDir(), "st")
	call(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--signer", "ada@tarn.example", "--write", file)...).want(t, 0)
	if out, err := exec.Command(program, "-Y", "sign", "-f", key("ada"), "-n", "speedtrail-signoff", file).CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	statement, signature := readFileOf(t, file), readFileOf(t, file+".sig")
	bring := in("sign", "1", "--statement", file, "--signature", file+".sig")
	put := func(name string, content string) {
		t.Helper()
		if err := os.WriteFile(name, []byte(content), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	mailed := func(b []byte) string { return strings.ReplaceAll(string(b), "\n", "\r\n") }
	refused := func(text string) {
		t.Helper()
		if got := call(t, bring...); got.status != statusInput || !strings.Contains(got.errors, text) {
			t.Errorf("status %d, no %q: %s", got.status, text, got.errors)
		}
	}
	lines := func(name string) string {
		return "the lines of " + name + " end with CR LF, as mail and some editors leave them; what was signed ends them with LF alone\nhint: send it in an archive, or take each CR out: tr -d '\\r' < " + shellWord(name)
	}
	put(file, mailed(statement))
	refused(lines(file))
	put(file, string(statement[:len(statement)-1]))
	refused(`the line feed at the end of the line "head" is missing`)
	put(file, string(statement))
	put(file+".sig", mailed(signature))
	refused(lines(file + ".sig"))
	put(file, strings.ReplaceAll(mailed(statement), "\r", ""))
	put(file+".sig", strings.ReplaceAll(mailed(signature), "\r", ""))
	call(t, bring...).want(t, 0)

	// The page of a report holds both as files, to the byte.
	page := call(t, in("report", "1", "--format", "html")...).want(t, 0).out
	for name, want := range map[string][]byte{"statement": statement, "statement.sig": signature} {
		link := regexp.MustCompile(`href="data:application/octet-stream;base64,([^"]*)" download="` + regexp.QuoteMeta(name) + `"`).FindStringSubmatch(page)
		if link == nil {
			t.Fatalf("%s cannot be had from the page", name)
		}
		got, err := base64.StdEncoding.DecodeString(html.UnescapeString(link[1]))
		if err != nil || string(got) != string(want) {
			t.Errorf("%s: %v\n%s", name, err, got)
		}
	}
}
