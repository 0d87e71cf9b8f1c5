package signoff

import (
	"bytes"
	"crypto/ecdsa"
	"crypto/ed25519"
	"crypto/elliptic"
	"crypto/rand"
	"crypto/rsa"
	"encoding/pem"
	"errors"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"golang.org/x/crypto/ssh"
	"pgregory.net/rapid"

	"speedtrail/history/chain"
)

var hash = strings.Repeat("0123456789abcdef", 4)

func example(kind Kind) Statement {
	return Statement{
		Kind: kind, Ledger: hash[:32], Assessment: 3, Digest: hash, Base: hash[:40], Target: hash[:40], Revision: hash[:40], Folder: ".", Content: hash[:40],
		Rules: 2, Policy: hash, Findings: "outside 2, masked 1", Since: time.Date(2026, 3, 1, 4, 0, 0, 0, time.UTC), Corrects: "nothing", Key: "SHA256:abc",
		Role: "checker", Decision: Approve, Reason: "checked against the design", Signer: "a.lund@tarn.example",
		Time: time.Date(2026, 3, 2, 4, 5, 6, 0, time.UTC), Head: chain.Head{Seq: 4, Hash: hash},
	}
}

// The exact text of a sign-off: it is what people sign, and may not change.
func TestText(t *testing.T) {
	got, err := example(SignOff).Text()
	if err != nil {
		t.Fatal(err)
	}
	want := "speedtrail sign-off 1\nledger: 0123456789abcdef0123456789abcdef\nassessment: 3\ndigest: " + hash + "\nbase: " + hash[:40] +
		"\ntarget: " + hash[:40] + "\nfolder: .\nrules: 2\npolicy: " + hash + "\nfindings: outside 2, masked 1\nrole: checker\ndecision: approve\n" +
		"reason: checked against the design\nsigner: a.lund@tarn.example\ntime: 2026-03-02T04:05:06Z\nhead: 4:" + hash + "\n"
	if string(got) != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
}

// Parse undoes Text, and no statement of one kind reads as one of another.
func TestRoundTrip(t *testing.T) {
	var texts []string
	for _, kind := range every {
		b, err := example(kind).Text()
		if err != nil {
			t.Fatal(kind, err)
		}
		s, err := Parse(b)
		if err != nil {
			t.Fatal(kind, err)
		}
		again, err := s.Text()
		if err != nil || !bytes.Equal(again, b) || s.Kind != kind {
			t.Errorf("%s does not come back: %v", kind, err)
		}
		texts = append(texts, string(b))
		for _, other := range every {
			forged := strings.Replace(string(b), "speedtrail "+string(kind)+" 1", "speedtrail "+string(other)+" 1", 1)
			if _, err := Parse([]byte(forged)); other != kind && err == nil {
				t.Errorf("a %s reads as a %s", kind, other)
			}
		}
	}
	slices.Sort(texts)
	if len(slices.Compact(texts)) != len(every) {
		t.Error("two kinds have the same text")
	}
}

func TestMalformed(t *testing.T) {
	good, _ := example(SignOff).Text()
	for name, edit := range map[string]func(string) string{
		"empty":               func(string) string { return "" },
		"no final line feed":  func(s string) string { return s[:len(s)-1] },
		"a line more":         func(s string) string { return s + "note: more\n" },
		"a blank line":        func(s string) string { return s + "\n" },
		"carriage returns":    func(s string) string { return strings.ReplaceAll(s, "\n", "\r\n") },
		"a line less":         func(s string) string { return strings.Replace(s, "rules: 2\n", "", 1) },
		"two lines exchanged": func(s string) string { return strings.Replace(s, "folder: .\nrules: 2\n", "rules: 2\nfolder: .\n", 1) },
		"a line twice":        func(s string) string { return strings.Replace(s, "rules: 2\n", "rules: 2\nrules: 2\n", 1) },
		"version 2":           func(s string) string { return strings.Replace(s, "sign-off 1", "sign-off 2", 1) },
		"unknown kind":        func(s string) string { return strings.Replace(s, "sign-off 1", "licence 1", 1) },
		"a number with zeros": func(s string) string { return strings.Replace(s, "assessment: 3", "assessment: 03", 1) },
		"a number with plus":  func(s string) string { return strings.Replace(s, "assessment: 3", "assessment: +3", 1) },
		"no number":           func(s string) string { return strings.Replace(s, "rules: 2", "rules: two", 1) },
		"an empty value":      func(s string) string { return strings.Replace(s, "role: checker", "role: ", 1) },
		"a blank in front":    func(s string) string { return strings.Replace(s, "role: checker", "role:  checker", 1) },
		"a blank at the end":  func(s string) string { return strings.Replace(s, "role: checker", "role: checker ", 1) },
		"a tab in the reason": func(s string) string { return strings.Replace(s, "checked against", "checked\tagainst", 1) },
		"an escape code":      func(s string) string { return strings.Replace(s, "checked against", "checked \x1b[1m", 1) },
		"a line separator":    func(s string) string { return strings.Replace(s, "checked against", "checked\u2028against", 1) },
		"right to left":       func(s string) string { return strings.Replace(s, "checked against", "\u202echecked", 1) },
		"invalid UTF-8":       func(s string) string { return strings.Replace(s, "checked against", "checked\xff", 1) },
		"a local time":        func(s string) string { return strings.Replace(s, "04:05:06Z", "04:05:06+00:00", 1) },
		"fractions":           func(s string) string { return strings.Replace(s, "04:05:06Z", "04:05:06.000Z", 1) },
		"a head in capitals": func(s string) string {
			return strings.Replace(s, "head: 4:0123456789abcdef", "head: 4:0123456789ABCDEF", 1)
		},
		"no head":           func(s string) string { return strings.Replace(s, "head: 4:"+hash, "head: 4", 1) },
		"a long reason":     func(s string) string { return strings.Replace(s, "checked", strings.Repeat("x", MaxReason+1), 1) },
		"a byte order mark": func(s string) string { return "\uFEFF" + s },
	} {
		text := edit(string(good))
		if text == string(good) {
			t.Errorf("%s: nothing was altered", name)
		}
		if _, err := Parse([]byte(text)); !errors.Is(err, ErrMalformed) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// Whatever values a statement has, it is refused or comes back unaltered.
func TestNothingIsEscaped(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := example(Kind(rapid.SampledFrom(every).Draw(t, "kind")))
		s.Reason, s.Role, s.Folder = rapid.String().Draw(t, "reason"), rapid.String().Draw(t, "role"), rapid.String().Draw(t, "folder")
		s.Routes = rapid.SliceOfN(rapid.StringMatching(`[A-Za-z0-9._-]{1,8}`), 0, 3).Draw(t, "routes")
		b, err := s.Text()
		if err != nil {
			return
		}
		again, err := Parse(b)
		if err != nil {
			t.Fatal(err)
		}
		if again.Reason != s.Reason || again.Role != s.Role || again.Folder != s.Folder {
			t.Fatalf("%+v came back as %+v", s, again)
		}
	})
}

func FuzzParse(f *testing.F) {
	for _, kind := range every {
		b, _ := example(kind).Text()
		f.Add(b)
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		s, err := Parse(b)
		if err != nil {
			return
		}
		again, err := s.Text()
		if err != nil || !bytes.Equal(again, b) {
			t.Fatalf("%q comes back as %q, %v", b, again, err)
		}
	})
}

func signerOf(t *testing.T, key any) ssh.Signer {
	t.Helper()
	s, err := ssh.NewSignerFromKey(key)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func keys(t *testing.T) map[string]any {
	t.Helper()
	_, ed, err := ed25519.GenerateKey(rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	ec, err := ecdsa.GenerateKey(elliptic.P384(), rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	long, err := rsa.GenerateKey(rand.Reader, 2048)
	if err != nil {
		t.Fatal(err)
	}
	return map[string]any{"ed25519": ed, "ecdsa": ec, "rsa": long}
}

// Both ways round with ssh-keygen: it verifies what Sign makes, Verify accepts
// what it makes (ssh-keygen(1), -Y sign and -Y verify; PROTOCOL.sshsig).
func TestAgainstSSHKeygen(t *testing.T) {
	if _, err := exec.LookPath("ssh-keygen"); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("ssh-keygen is not installed")
	}
	message, err := example(SignOff).Text()
	if err != nil {
		t.Fatal(err)
	}
	for name, key := range keys(t) {
		dir := t.TempDir()
		signer := signerOf(t, key)
		write := func(name string, content []byte) string {
			file := filepath.Join(dir, name)
			if err := os.WriteFile(file, content, 0o600); err != nil {
				t.Fatal(err)
			}
			return file
		}
		block, err := ssh.MarshalPrivateKey(key, "")
		if err != nil {
			t.Fatal(err)
		}
		private := write("key", pem.EncodeToMemory(block))
		public := write("key.pub", ssh.MarshalAuthorizedKey(signer.PublicKey()))
		allowed := write("allowed", append([]byte("a.lund@tarn.example "), ssh.MarshalAuthorizedKey(signer.PublicKey())...))

		ours, err := Sign(message, signer)
		if err != nil {
			t.Fatal(err)
		}
		verify := exec.Command("ssh-keygen", "-Y", "verify", "-f", allowed, "-I", "a.lund@tarn.example", "-n", Namespace, "-s", write("ours.sig", ours))
		verify.Stdin = bytes.NewReader(message)
		if out, err := verify.CombinedOutput(); err != nil {
			t.Errorf("%s: ssh-keygen refuses our signature: %s", name, out)
		}

		statement := write("statement", message)
		if out, err := exec.Command("ssh-keygen", "-Y", "sign", "-f", private, "-n", Namespace, statement).CombinedOutput(); err != nil {
			t.Fatalf("%s: %s", name, out)
		}
		theirs, err := os.ReadFile(statement + ".sig")
		if err != nil {
			t.Fatal(err)
		}
		if err := Verify(message, theirs, signer.PublicKey()); err != nil {
			t.Errorf("%s: the signature of ssh-keygen: %v", name, err)
		}
		if _, fingerprint, err := Key(theirs); err != nil {
			t.Error(err)
		} else if out, _ := exec.Command("ssh-keygen", "-l", "-f", public).Output(); !strings.Contains(string(out), fingerprint) {
			t.Errorf("%s: fingerprint %s, ssh-keygen says %s", name, fingerprint, out)
		}

		other := write("other-namespace", message)
		if out, err := exec.Command("ssh-keygen", "-Y", "sign", "-f", private, "-n", "file", other).CombinedOutput(); err != nil {
			t.Fatalf("%s: %s", name, out)
		}
		foreign, err := os.ReadFile(other + ".sig")
		if err != nil {
			t.Fatal(err)
		}
		if err := Verify(message, foreign, signer.PublicKey()); !errors.Is(err, ErrSignature) || !strings.Contains(err.Error(), "namespace") {
			t.Errorf("%s: a signature of another namespace: %v", name, err)
		}
	}
}

func TestBadSignatures(t *testing.T) {
	message, _ := example(SignOff).Text()
	made := keys(t)
	signer := signerOf(t, made["ed25519"])
	good, err := Sign(message, signer)
	if err != nil {
		t.Fatal(err)
	}
	if err := Verify(message, good, signer.PublicKey()); err != nil {
		t.Fatal(err)
	}
	if err := Verify(append([]byte("x"), message...), good, signer.PublicKey()); !errors.Is(err, ErrSignature) {
		t.Errorf("another statement: %v", err)
	}
	if err := Verify(message, good, signerOf(t, made["ecdsa"]).PublicKey()); !errors.Is(err, ErrSignature) {
		t.Errorf("another key: %v", err)
	}
	short, err := rsa.GenerateKey(rand.Reader, 1024)
	if err == nil {
		weak := signerOf(t, short)
		if b, err := Sign(message, weak); err == nil {
			if err := Verify(message, b, weak.PublicKey()); !errors.Is(err, ErrSignature) || !strings.Contains(err.Error(), "2048") {
				t.Errorf("a short RSA key: %v", err)
			}
		}
	}
	for name, edit := range map[string]func(string) string{
		"empty":              func(string) string { return "" },
		"twice":              func(s string) string { return s + s },
		"text in front":      func(s string) string { return "x\n" + s },
		"text behind":        func(s string) string { return s + "x\n" },
		"carriage returns":   func(s string) string { return strings.ReplaceAll(s, "\n", "\r\n") },
		"other line lengths": func(s string) string { return rewrap(s, 64) },
		"a byte altered":     func(s string) string { return s[:60] + flip(s[60]) + s[61:] },
		"no end":             func(s string) string { return strings.TrimSuffix(s, armorEnd) },
		"a blank line":       func(s string) string { return strings.Replace(s, "\n", "\n\n", 1) },
		"surplus bytes":      func(s string) string { return strings.Replace(s, "\n"+armorEnd, "AAAA\n"+armorEnd, 1) },
		"too long":           func(s string) string { return s + strings.Repeat("x", MaxSignature) },
	} {
		b := edit(string(good))
		if b == string(good) {
			t.Errorf("%s: nothing was altered", name)
		}
		if err := Verify(message, []byte(b), signer.PublicKey()); !errors.Is(err, ErrSignature) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func flip(c byte) string {
	if c == 'A' {
		return "B"
	}
	return "A"
}

// rewrap breaks the lines of an armoured signature elsewhere.
func rewrap(s string, width int) string {
	body := strings.ReplaceAll(strings.TrimSuffix(strings.TrimPrefix(s, armorBegin), armorEnd), "\n", "")
	var b strings.Builder
	b.WriteString(armorBegin)
	for len(body) > 0 {
		n := min(width, len(body))
		b.WriteString(body[:n] + "\n")
		body = body[n:]
	}
	return b.String() + armorEnd
}

func FuzzSignature(f *testing.F) {
	message, _ := example(SignOff).Text()
	_, key, err := ed25519.GenerateKey(bytes.NewReader(bytes.Repeat([]byte{7}, 64)))
	if err != nil {
		f.Fatal(err)
	}
	signer, err := ssh.NewSignerFromKey(key)
	if err != nil {
		f.Fatal(err)
	}
	good, err := Sign(message, signer)
	if err != nil {
		f.Fatal(err)
	}
	f.Add(good)
	f.Fuzz(func(t *testing.T, b []byte) {
		// Ed25519 is deterministic and strict: no other bytes are a signature.
		if err := Verify(message, b, signer.PublicKey()); err == nil && !bytes.Equal(b, good) {
			t.Fatalf("%q passes as a signature", b)
		}
	})
}

// sha1Signer signs with RSA over SHA-1, as old programs do.
type sha1Signer struct{ ssh.AlgorithmSigner }

func (s sha1Signer) SignWithAlgorithm(random io.Reader, data []byte, _ string) (*ssh.Signature, error) {
	return s.AlgorithmSigner.SignWithAlgorithm(random, data, ssh.KeyAlgoRSA)
}

// RSA over SHA-1 is refused, though it is a good signature of that kind.
func TestRSAOverSHA1(t *testing.T) {
	message, _ := example(SignOff).Text()
	signer := signerOf(t, keys(t)["rsa"])
	b, err := Sign(message, sha1Signer{signer.(ssh.AlgorithmSigner)})
	if err != nil {
		t.Fatal(err)
	}
	if err := Verify(message, b, signer.PublicKey()); !errors.Is(err, ErrSignature) || !strings.Contains(err.Error(), "ssh-rsa") {
		t.Errorf("got %v", err)
	}
}
