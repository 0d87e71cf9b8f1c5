package signoff

import (
	"bytes"
	"crypto/ecdsa"
	"crypto/ed25519"
	"crypto/elliptic"
	"crypto/rand"
	"crypto/sha256"
	"encoding/binary"
	"errors"
	"io"
	"math/big"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"golang.org/x/crypto/ssh"
)

// application is what the keys of ssh-keygen are for.
const application = "ssh:"

// securityKey signs as a FIDO key does, without the device: over the hash of the
// application, the flags, the counter and the hash of the message (PROTOCOL.u2f).
type securityKey struct {
	public ssh.PublicKey
	sign   func(data []byte) []byte // gives the blob of a signature
	flags  byte
	short  int // bytes that are cut off behind the signature; below 0, surplus ones
}

func (k securityKey) PublicKey() ssh.PublicKey { return k.public }

func (k securityKey) Sign(_ io.Reader, data []byte) (*ssh.Signature, error) {
	of, message := sha256.Sum256([]byte(application)), sha256.Sum256(data)
	rest := binary.BigEndian.AppendUint32([]byte{k.flags}, 7)
	blob := k.sign(bytes.Join([][]byte{of[:], rest, message[:]}, nil))
	if k.short < 0 {
		rest = append(rest, make([]byte, -k.short)...)
	} else {
		rest = rest[:len(rest)-k.short]
	}
	return &ssh.Signature{Format: k.public.Type(), Blob: blob, Rest: rest}, nil
}

// securityKeys makes one of each type.
func securityKeys(t *testing.T) []securityKey {
	t.Helper()
	read := func(fields any) ssh.PublicKey {
		key, err := ssh.ParsePublicKey(ssh.Marshal(fields))
		if err != nil {
			t.Fatal(err)
		}
		return key
	}
	edPublic, ed, err := ed25519.GenerateKey(rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	ec, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	point, err := ec.PublicKey.Bytes()
	if err != nil {
		t.Fatal(err)
	}
	return []securityKey{
		{public: read(struct {
			Name        string
			Key         []byte
			Application string
		}{ssh.KeyAlgoSKED25519, edPublic, application}), sign: func(data []byte) []byte { return ed25519.Sign(ed, data) }},
		{public: read(struct {
			Name, Curve string
			Key         []byte
			Application string
		}{ssh.KeyAlgoSKECDSA256, "nistp256", point, application}), sign: func(data []byte) []byte {
			sum := sha256.Sum256(data)
			r, s, err := ecdsa.Sign(rand.Reader, ec, sum[:])
			if err != nil {
				t.Fatal(err)
			}
			return ssh.Marshal(struct{ R, S *big.Int }{r, s})
		}},
	}
}

// FIDO keys count where they were touched (signoff.md, Signing): bit 0 of the
// flags. Bit 2, that the key knows its user, is not asked for and does not stand in
// for it.
func TestSecurityKeys(t *testing.T) {
	message, err := example(SignOff).Text()
	if err != nil {
		t.Fatal(err)
	}
	for _, key := range securityKeys(t) {
		for name, c := range map[string]struct {
			flags  byte
			short  int
			refuse string
		}{
			"touched":                   {1, 0, ""},
			"touched by a known user":   {5, 0, ""},
			"not touched":               {0, 0, "the security key was not touched"},
			"known, but not touched":    {4, 0, "the security key was not touched"},
			"without flags and counter": {1, 5, "it is not one of a security key"},
			"a counter too short":       {1, 1, "it is not one of a security key"},
			"a byte behind the counter": {1, -1, "it is not one of a security key"},
		} {
			t.Run(key.public.Type()+"/"+name, func(t *testing.T) {
				key.flags, key.short = c.flags, c.short
				b, err := Sign(message, key)
				if err != nil {
					t.Fatal(err)
				}
				err = Verify(message, b, key.public)
				if c.refuse == "" {
					if err != nil {
						t.Error(err)
					}
					if err := Verify(append(message, 'x'), b, key.public); !errors.Is(err, ErrSignature) {
						t.Errorf("over another statement: %v", err)
					}
				} else if !errors.Is(err, ErrSignature) || !strings.Contains(err.Error(), c.refuse) {
					t.Errorf("got %v, want a refusal with %q", err, c.refuse)
				}
			})
		}
	}
}

// A signature by another algorithm than its key's counts for nothing: no security
// key's for a plain key, nor the other way round.
func TestOtherAlgorithms(t *testing.T) {
	message, _ := example(SignOff).Text()
	made, touched := keys(t), securityKeys(t)
	signers := []ssh.Signer{signerOf(t, made["ed25519"]), signerOf(t, made["ecdsa"])}
	for _, key := range touched {
		key.flags = 1
		signers = append(signers, key)
	}
	for i, signer := range signers {
		for _, as := range signers {
			format := as.PublicKey().Type()
			b, err := Sign(message, renamed{signer, format})
			if err != nil {
				t.Fatal(err)
			}
			err = Verify(message, b, signer.PublicKey())
			if format == signer.PublicKey().Type() {
				if err != nil {
					t.Errorf("%s: %v", format, err)
				}
				continue
			}
			want := "algorithm \"" + format + "\" with a key of type"
			if i >= len(signers)-len(touched) {
				want = "it is not one of a security key"
			}
			if !errors.Is(err, ErrSignature) || !strings.Contains(err.Error(), want) {
				t.Errorf("%s as %s: %v", signer.PublicKey().Type(), format, err)
			}
		}
	}
}

// renamed gives its signatures the name of another algorithm.
type renamed struct {
	ssh.Signer
	format string
}

func (r renamed) Sign(random io.Reader, data []byte) (*ssh.Signature, error) {
	s, err := r.Signer.Sign(random, data)
	s.Format = r.format
	return s, err
}

// Bytes behind a signature that has none by its type are not what was signed:
// one signature has one text.
func TestSurplusBehindSignature(t *testing.T) {
	message, _ := example(SignOff).Text()
	made := keys(t)
	for _, name := range []string{"ed25519", "ecdsa", "rsa"} {
		signer := signerOf(t, made[name])
		good, err := Sign(message, signer)
		if err != nil {
			t.Fatal(err)
		}
		s, err := unarmor(good)
		if err != nil {
			t.Fatal(err)
		}
		s.Signature.Rest = []byte{1, 0, 0, 0, 7}
		if err := Verify(message, armor(s), signer.PublicKey()); !errors.Is(err, ErrSignature) || !strings.Contains(err.Error(), "surplus bytes follow it") {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// ssh-keygen takes the signatures of these keys for what they are: the tests above
// are about the form that security keys have.
func TestSecurityKeysAgainstSSHKeygen(t *testing.T) {
	if _, err := exec.LookPath("ssh-keygen"); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("ssh-keygen is not installed")
	}
	message, _ := example(SignOff).Text()
	for _, key := range securityKeys(t) {
		key.flags = 1
		b, err := Sign(message, key)
		if err != nil {
			t.Fatal(err)
		}
		dir := t.TempDir()
		for name, content := range map[string][]byte{"signature": b, "allowed": append([]byte("a.lund@tarn.example "), ssh.MarshalAuthorizedKey(key.public)...)} {
			if err := os.WriteFile(filepath.Join(dir, name), content, 0o600); err != nil {
				t.Fatal(err)
			}
		}
		verify := exec.Command("ssh-keygen", "-Y", "verify", "-f", filepath.Join(dir, "allowed"), "-I", "a.lund@tarn.example", "-n", Namespace, "-s", filepath.Join(dir, "signature"))
		verify.Stdin = bytes.NewReader(message)
		if out, err := verify.CombinedOutput(); err != nil {
			t.Errorf("%s: ssh-keygen refuses it: %s", key.public.Type(), out)
		}
	}
}
