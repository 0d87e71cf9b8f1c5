package approval

import (
	"encoding/pem"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/hiddeco/sshsig"
	"golang.org/x/crypto/ssh"

	"speedtrail/history/signoff"
	"speedtrail/schema"
)

// A line of allowed_signers that lets a key sign here lets it sign for ssh-keygen:
// what an auditor verifies without this program comes out the same. The other way
// round is not promised, the form is stricter here.
func TestOptionsAsSSHKeygenReadsThem(t *testing.T) {
	if _, err := exec.LookPath("ssh-keygen"); err != nil {
		t.Skip("no ssh-keygen on this machine")
	}
	dir := t.TempDir()
	write := func(name string, content []byte) string {
		file := filepath.Join(dir, name)
		if err := os.WriteFile(file, content, 0o600); err != nil {
			t.Fatal(err)
		}
		return file
	}
	const message = "a statement\n"
	s, err := sshsig.Sign(strings.NewReader(message), keyOf("ada"), sshsig.HashSHA512, signoff.Namespace)
	if err != nil {
		t.Fatal(err)
	}
	signature := write("sig", pem.EncodeToMemory(&pem.Block{Type: "SSH SIGNATURE", Bytes: s.Marshal()}))
	public := strings.TrimSpace(string(ssh.MarshalAuthorizedKey(keyOf("ada").PublicKey())))
	at := time.Date(2026, 3, 1, 0, 0, 0, 0, time.UTC)
	roles, _ := ordinary().files()
	_, others := ordinary().without("ada").files()
	for options, want := range map[string]bool{
		"":                                     true,
		`namespaces="speedtrail-signoff"`:      true,
		`NameSpaces="file,speedtrail-signoff"`: true,
		`namespaces="file"`:                    false,
		`namespaces="SPEEDTRAIL-SIGNOFF"`:      false,
		`namespaces="speedtrail-signoff,!speedtrail-signoff"`:     false,
		`namespaces="!file,speedtrail-signoff"`:                   false,
		`namespaces="speedtrail-*"`:                               false,
		`namespaces=""`:                                           false,
		`namespaces`:                                              false,
		`namespaces=speedtrail-signoff`:                           false,
		`namespaces="file, speedtrail-signoff"`:                   false,
		`namespaces=""speedtrail-signoff""`:                       false,
		`namespaces="file\",speedtrail-signoff"`:                  false,
		`namespaces="speedtrail-signoff",`:                        false,
		`namespaces="speedtrail-signoff"x`:                        false,
		`valid-after="20260301Z"`:                                 true,
		`valid-after="202603010000Z"`:                             true,
		`valid-after="20260301000000Z"`:                           true,
		`valid-after="20260301000001Z"`:                           false,
		`valid-after=20260301Z`:                                   false,
		`valid-before="20260301Z"`:                                true,
		`valid-before="20260228235959Z"`:                          false,
		`valid-before="20260301000000.5Z"`:                        false,
		`valid-before="20260301240000Z"`:                          false,
		`valid-before=" 20260301Z"`:                               false,
		`valid-before="20260301Z",valid-after="20260301Z"`:        false,
		`Valid-Before="20260301000001Z",valid-after="20260301Z"`:  true,
		`valid-before="20260301Z",VALID-before="20270301Z"`:       false,
		`namespaces="speedtrail-signoff",valid-after="20260101Z"`: true,
		`namespaces="speedtrail-signoff" valid-after="20260101Z"`: false,
	} {
		line := strings.Join(strings.Fields("ada@tarn.example "+options+" "+public), " ") + "\n"
		ours := false
		if p, err := schema.ParsePolicy([]byte(roles), []byte(line+others)); err == nil {
			_, err = allowedKey(p, fingerprintOf("ada"), "ada@tarn.example", at)
			ours = err == nil
		}
		verify := exec.Command("ssh-keygen", "-Y", "verify", "-f", write("allowed", []byte(line)), "-I", "ada@tarn.example", "-n", signoff.Namespace, "-s", signature, "-Overify-time=20260301000000Z")
		verify.Stdin = strings.NewReader(message)
		out, err := verify.CombinedOutput()
		if theirs := err == nil; ours != want || ours && !theirs {
			t.Errorf("%s: taken here: %t, want %t; by ssh-keygen: %t %s", options, ours, want, theirs, out)
		}
	}
}
