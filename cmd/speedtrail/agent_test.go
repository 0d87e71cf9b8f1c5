package main

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// Keys in the ssh-agent of OpenSSH sign as those in files do: of several the one
// that the policy allows to the signer, and none that it does not know.
func TestAgent(t *testing.T) {
	programs := map[string]string{}
	for _, name := range []string{"ssh-agent", "ssh-add", "ssh-keygen"} {
		program, err := exec.LookPath(name)
		if err != nil {
			if os.Getenv("CI") == "true" {
				t.Fatal(err)
			}
			t.Skipf("the %s program is not installed", name)
		}
		programs[name] = program
	}
	// The name of a socket has to be short.
	short, err := os.MkdirTemp("", "st")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(short) })
	socket := filepath.Join(short, "agent")
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, statusFinding)
	sign := func(args ...string) called {
		return call(t, append(in("sign", "1", "--decision", "approve", "--reason", "seen", "--agent", "-y"), args...)...)
	}
	refused := func(got called, what string) {
		t.Helper()
		if got.status != statusInput || !strings.Contains(got.errors, what) {
			t.Errorf("%q: status %d\n%s", got.args, got.status, got.errors)
		}
	}

	t.Setenv("SSH_AUTH_SOCK", "")
	refused(sign("--role", "checker"), "SSH_AUTH_SOCK is not set")
	t.Setenv("SSH_AUTH_SOCK", socket)
	refused(sign("--role", "checker"), "ssh-agent does not answer")

	agent := exec.CommandContext(t.Context(), programs["ssh-agent"], "-D", "-a", socket)
	if err := agent.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { agent.Process.Kill(); agent.Wait() })
	for range 500 {
		if _, err := os.Stat(socket); err == nil {
			break
		}
		time.Sleep(10 * time.Millisecond)
	}
	add := func(files ...string) {
		t.Helper()
		if out, err := exec.CommandContext(t.Context(), programs["ssh-add"], files...).CombinedOutput(); err != nil {
			t.Fatalf("%v: %s", err, out)
		}
	}
	stranger := filepath.Join(t.TempDir(), "stranger")
	if out, err := exec.CommandContext(t.Context(), programs["ssh-keygen"], "-q", "-t", "ed25519", "-N", "", "-f", stranger).CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	add(stranger)
	refused(sign("--role", "checker"), "ssh-agent holds no key that the policy of the base allows to anyone")
	add(key("ada"), key("bea"))
	refused(sign("--role", "checker", "--signer", "cem@tarn.example"), "ssh-agent holds no key that the policy of the base allows to cem@tarn.example")
	// ada, whose key was added first, signs where nobody is named.
	if got := sign("--role", "checker").want(t, 0); !strings.Contains(got.out+got.errors, "ada@tarn.example") {
		t.Errorf("%s%s", got.out, got.errors)
	}
	sign("--role", "approver", "--signer", "bea@tarn.example").want(t, 0)
	if got := call(t, in("register")...).want(t, 0); !strings.Contains(got.out, "approve as approver by bea@tarn.example") {
		t.Error(got.out)
	}
	call(t, in("verify")...).want(t, 0)
}
