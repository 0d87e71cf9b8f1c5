package main

import (
	"bytes"
	"crypto/ed25519"
	"crypto/sha256"
	"encoding/pem"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"golang.org/x/crypto/ssh"
)

// called is what one call gave.
type called struct {
	args        []string
	status      int
	out, errors string
}

// call runs the command as main does, without a process of its own.
func call(t testing.TB, args ...string) called {
	t.Helper()
	var out, errs bytes.Buffer
	c := called{args: args, status: run(t.Context(), args, strings.NewReader(""), &out, &errs)}
	c.out, c.errors = out.String(), errs.String()
	return c
}

// want checks the exit status.
func (c called) want(t testing.TB, status int) called {
	t.Helper()
	if c.status != status {
		t.Fatalf("%q: status %d, want %d\n%s\n%.2000s", c.args, c.status, status, c.errors, c.out)
	}
	return c
}

// testKey makes the same key for a name in every run, and writes its file.
func testKey(t testing.TB, dir, name string) (file, public string) {
	t.Helper()
	seed := sha256.Sum256([]byte("test key " + name))
	key := ed25519.NewKeyFromSeed(seed[:])
	block, err := ssh.MarshalPrivateKey(key, name)
	if err != nil {
		t.Fatal(err)
	}
	file = filepath.Join(dir, name)
	if err := os.WriteFile(file, pem.EncodeToMemory(block), 0o600); err != nil {
		t.Fatal(err)
	}
	signer, err := ssh.NewSignerFromKey(key)
	if err != nil {
		t.Fatal(err)
	}
	return file, strings.TrimSpace(string(ssh.MarshalAuthorizedKey(signer.PublicKey())))
}

// quoted writes a TOML string.
func quoted(s string) string {
	return `"` + strings.NewReplacer(`\`, `\\`, `"`, `\"`).Replace(s) + `"`
}

// cell writes a CSV cell.
func cell(s string) string { return `"` + strings.ReplaceAll(s, `"`, `""`) + `"` }

// policyOf writes the two files of a policy in which ada checks, bea approves
// and cem puts into service.
func policyOf(t testing.TB, keys string) (signoff, signers string) {
	signoff = "format = 1\n"
	for _, name := range []string{"ada", "bea", "cem"} {
		_, public := testKey(t, keys, name)
		signers += name + "@tarn.example " + public + "\n"
		signoff += fmt.Sprintf("\n[[person]]\nprincipal = \"%s@tarn.example\"\nemails = [\"%s@tarn.example\"]\n", name, name)
	}
	signoff += "\n[[role]]\nname = \"checker\"\nneeded = 1\nindependent_of = [\"preparer\"]\n" +
		"\n[[role]]\nname = \"approver\"\nneeded = 1\nindependent_of = [\"preparer\", \"checker\"]\n" +
		"\n[[role]]\nname = \"in-service\"\nneeded = 1\nindependent_of = []\nsigners = [\"cem@tarn.example\"]\n"
	return signoff, signers
}

func readFileOf(t testing.TB, name string) []byte {
	t.Helper()
	data, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	return data
}
