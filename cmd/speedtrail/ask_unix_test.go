//go:build unix

package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"github.com/creack/pty"
	"golang.org/x/term"
)

// screen is what a program has written to a terminal.
type screen struct {
	mu   sync.Mutex
	text bytes.Buffer
}

func (s *screen) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.text.Write(p)
}

func (s *screen) String() string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.text.String()
}

// shows waits until the screen ends with a text.
func (s *screen) shows(t *testing.T, text string) {
	t.Helper()
	for range 1000 {
		if strings.HasSuffix(s.String(), text) {
			return
		}
		time.Sleep(10 * time.Millisecond)
	}
	t.Fatalf("%q is not asked: %s", text, s)
}

// What signing asks on a terminal: a passphrase, without showing it, and a yes.
// Ctrl-C ends either question at once, with the echo back and nothing signed.
func TestAsk(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, statusFinding)
	lockKey(t, key("ada"), "open sesame")

	const passphrase, yes = ": ", "Type yes: "
	for _, test := range []struct {
		name    string
		types   []string // an answer to each question
		status  int
		message string
	}{
		{"Ctrl-C for the passphrase", []string{"\x03"}, statusFailed, "interrupted, nothing more was done"},
		{"Ctrl-C in the middle of it", []string{"open\x03"}, statusFailed, "interrupted, nothing more was done"},
		{"a wrong passphrase", []string{"sesame\n"}, statusInput, "is wrong"},
		{"Ctrl-C in place of yes", []string{"open sesame\n", "\x03"}, statusFailed, "interrupted, nothing more was done"},
		{"y", []string{"open sesame\n", "y\n"}, statusInput, "not signed"},
		{"no answer in place of yes", []string{"open sesame\n", "\x04"}, statusInput, "not signed"},
		{"yes", []string{"open sesame\n", "yes\n"}, 0, "approve"},
	} {
		t.Run(test.name, func(t *testing.T) {
			c, _, _ := process(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"))...)
			c.Env = append(os.Environ(), "TERM=dumb")
			ours, theirs, err := pty.Open()
			if err != nil {
				t.Fatal(err)
			}
			defer ours.Close()
			defer theirs.Close()
			before, err := term.GetState(int(theirs.Fd()))
			if err != nil {
				t.Fatal(err)
			}
			c.Stdin, c.Stdout, c.Stderr = theirs, theirs, theirs
			c.SysProcAttr = &syscall.SysProcAttr{Setsid: true, Setctty: true}
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			var s screen
			go func() {
				b := make([]byte, 4096)
				for {
					n, err := ours.Read(b)
					s.Write(b[:n])
					if err != nil {
						return
					}
				}
			}()
			for i, answer := range test.types {
				s.shows(t, []string{passphrase, yes}[i])
				// Nobody types faster than the echo is turned off.
				for i == 0 {
					if now, err := term.GetState(int(theirs.Fd())); err != nil || !reflect.DeepEqual(now, before) {
						break
					}
					time.Sleep(time.Millisecond)
				}
				if _, err := ours.WriteString(answer); err != nil {
					t.Fatal(err)
				}
			}
			status := ended(t, c, 20*time.Second)
			for range 500 { // what it wrote last is on its way
				if strings.Contains(s.String(), test.message) {
					break
				}
				time.Sleep(10 * time.Millisecond)
			}
			if !status.Exited() || status.ExitStatus() != test.status || !strings.Contains(s.String(), test.message) {
				t.Errorf("exited %v, status %d\n%s", status.Exited(), status.ExitStatus(), &s)
			}
			if strings.Contains(s.String(), "sesame") {
				t.Errorf("the passphrase is shown:\n%s", &s)
			}
			if after, err := term.GetState(int(theirs.Fd())); err != nil || !reflect.DeepEqual(after, before) {
				t.Errorf("the terminal is %v, it was %v (%v)", after, before, err)
			}
			signed := strings.Contains(call(t, in("register")...).want(t, 0).out, "approve as checker by ada")
			if signed != (test.status == 0) {
				t.Errorf("signed: %v", signed)
			}
		})
	}
}

// Nobody is asked for a passphrase to sign what would be refused.
func TestRefusedBeforeThePassphrase(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	whole := in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")
	call(t, whole...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, statusFinding)
	lockKey(t, key("ada"), "open sesame")
	ours, theirs, err := pty.Open()
	if err != nil {
		t.Fatal(err)
	}
	defer ours.Close()
	defer theirs.Close()
	for text, args := range map[string][]string{
		"has an anchor already":              whole,
		"ada@tarn.example is no signer of":   in("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", key("ada")),
		`the policy has no role "aprover"`:   in("sign", "1", "--role", "aprover", "--decision", "approve", "--reason", "seen", "--key", key("ada")),
		"no policy in this ledger has a key": in("revoke", "SHA256:x", "--role", "owner", "--reason", "lost", "--key", key("ada")),
	} {
		var out, errs bytes.Buffer
		if status := run(t.Context(), args, theirs, &out, &errs); status != statusInput || !strings.Contains(errs.String(), text) || strings.Contains(errs.String(), "passphrase") {
			t.Errorf("%q: status %d\n%s", args, status, &errs)
		}
	}
}

// lockKey gives a private key a passphrase, by the real program.
func lockKey(t *testing.T, file, passphrase string) {
	t.Helper()
	program, err := exec.LookPath("ssh-keygen")
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("the ssh-keygen program is not installed")
	}
	if out, err := exec.CommandContext(t.Context(), program, "-q", "-p", "-P", "", "-N", passphrase, "-f", file).CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
}
