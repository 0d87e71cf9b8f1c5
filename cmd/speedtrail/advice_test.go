package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// A call that is advised is about the ledger and the repository of this one.
func TestAdviceRepeatsOptions(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	file := filepath.Join(t.TempDir(), "the ledger's.db")
	options := "--repo " + repo + " --ledger " + shellWord(file) + " "
	for _, step := range []struct {
		advice string
		args   []string
	}{
		{"", []string{"anchor", "c0", "--sign", "checker=" + key("ada"), "--sign", "approver=" + key("bea"), "--sign", "in-service=" + key("cem"), "--reason", "root", "-y"}},
		{"assess BASE TARGET\n", []string{"register"}},
		{"inforce record REV --since T\n", []string{"inforce"}},
		{"inforce lists what is", []string{"inforce", "--when", "2026-03-01T00:00:00Z"}},
		{"register lists the assessments", []string{"report", "x"}},
		{"inforce record REV --since T", []string{"inforce", "record", "--reason", "x", "--key", "k"}},
		{"report 1 --out report.html\n", []string{"assess", "c0", "c1", "--format", "csv"}},
		{"report 1 --out report.html\n", []string{"assess", "c0", "c1"}},
		{"report 1 --out report.html\n", []string{"report", "1"}},
		{"profile ", []string{"report", "1"}},
		{"sign 1 --statement statement --signature statement.sig\n", []string{"export", "1"}},
		{"report 1 --out report.html\n\n", []string{"sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y"}},
		{"report 1 --out report.html\n", []string{"register"}},
	} {
		got := call(t, append([]string{"--repo", repo, "--ledger", file}, step.args...)...)
		if want := "speedtrail " + options + step.advice; step.advice != "" && !strings.Contains(got.out+got.errors, want) {
			t.Errorf("%q: no %q in\n%s%s", step.args, want, got.errors, got.out)
		}
	}
	// Without options the advice has none.
	call(t, "--repo", repo, "import", "-").want(t, statusInput)
	t.Chdir(repo)
	if got := call(t, "register"); !strings.Contains(got.errors, "hint: name one with --ledger, make one from an export with speedtrail import FILE, or begin one with speedtrail assess BASE TARGET\n") {
		t.Errorf("%s", got.errors)
	}
}

func TestShellWord(t *testing.T) {
	for _, c := range [][3]string{
		{"linux", "net/ledger.db", "net/ledger.db"}, {"linux", "", "''"}, {"linux", "my net", "'my net'"}, {"linux", "the ledger's", `'the ledger'\''s'`}, {"linux", `a\b`, `'a\b'`}, {"linux", "$HOME", "'$HOME'"},
		{"windows", `C:\net\ledger.db`, `C:\net\ledger.db`}, {"windows", `C:\my net`, `"C:\my net"`},
	} {
		if got := quotedFor(c[0], c[1]); got != c[2] {
			t.Errorf("%s: %q gives %s, want %s", c[0], c[1], got, c[2])
		}
	}
}

// What an option is called depends on the command, and whose policy a key lacks is said.
func TestKeyHints(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60}, []time.Time{at})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	text := filepath.Join(keys, "text")
	if err := os.WriteFile(text, []byte("no key\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	for _, file := range []string{text, filepath.Join(keys, "none")} {
		got := call(t, in("anchor", "c0", "--sign", "checker="+file, "--reason", "root")...)
		if got.status != statusInput || !strings.Contains(got.errors, "--sign ROLE=KEYFILE") || strings.Contains(got.errors, "--key") || strings.Contains(got.errors, "--agent") {
			t.Errorf("%s: status %d\n%s", file, got.status, got.errors)
		}
	}
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	if got := call(t, in("anchor", "c0", "--bring", text+"2")...); got.status != statusInput || !strings.Contains(got.errors, "--bring FILE takes FILE") {
		t.Errorf("%s", got.errors)
	}

	// Dot is a person with a key in the target only.
	gitIn(t, repo, "checkout", "-q", "-B", "line", "c0")
	_, public := testKey(t, keys, "dot")
	signers := append(readFileOf(t, filepath.Join(repo, "allowed_signers")), "dot@tarn.example "+public+"\n"...)
	signoff := append(readFileOf(t, filepath.Join(repo, "signoff.toml")), "\n[[person]]\nprincipal = \"dot@tarn.example\"\nemails = [\"dot@tarn.example\"]\n"...)
	for name, content := range map[string][]byte{"allowed_signers": signers, "signoff.toml": signoff} {
		if err := os.WriteFile(filepath.Join(repo, name), content, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	gitIn(t, repo, "commit", "-q", "-a", "-m", "Dot")
	call(t, in("assess", "c0", "line")...).want(t, 1)
	got := call(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("dot"), "-y")...)
	if got.status != statusInput || !strings.Contains(got.errors, "is not allowed to anyone by the policy of the base") || !strings.Contains(got.errors, "the policy of the target allows it to dot@tarn.example") {
		t.Errorf("%s", got.errors)
	}
	got = call(t, in("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", key("dot"), "-y")...)
	if !strings.Contains(got.errors, "by the policy of the newest approved revision") {
		t.Errorf("%s", got.errors)
	}
	got = call(t, in("inforce", "record", "c0", "--since", "", "--reason", "start", "--key", key("cem"), "-y")...)
	if !strings.Contains(got.errors, "--since is missing") {
		t.Errorf("%s", got.errors)
	}
}

// An advice that names an option itself does not get it twice.
func TestAdviceKeepsItsOptions(t *testing.T) {
	a := app{repo: "net", data: "speeds"}
	want := "speedtrail --repo net profile 0123456789 --data=speeds --route=A"
	if got := a.advise("speedtrail profile 0123456789 --data=speeds --route=A"); got != want {
		t.Errorf("got %s, want %s", got, want)
	}
}
