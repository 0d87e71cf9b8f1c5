package signoff

import (
	"bytes"
	"crypto/rsa"
	"crypto/sha256"
	"encoding/base64"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"

	"github.com/hiddeco/sshsig"
	"golang.org/x/crypto/ssh"
)

const (
	armorBegin = "-----BEGIN SSH SIGNATURE-----\n"
	armorEnd   = "-----END SSH SIGNATURE-----\n"
	// armorWidth is how ssh-keygen breaks the lines of an armoured signature.
	armorWidth = 70
	// leastRSA is the least size of an RSA key in bits.
	leastRSA = 2048
)

// MaxSignature bounds an armoured signature in bytes.
const MaxSignature = 16 << 10

// ErrSignature is the class of everything that is wrong with a signature.
var ErrSignature = errors.New("bad signature")

func bad(format string, args ...any) error {
	return fmt.Errorf("%w: "+format, append([]any{ErrSignature}, args...)...)
}

// armor writes a signature as ssh-keygen does.
func armor(s *sshsig.Signature) []byte {
	text := base64.StdEncoding.EncodeToString(s.Marshal())
	var b bytes.Buffer
	b.WriteString(armorBegin)
	for len(text) > 0 {
		n := min(armorWidth, len(text))
		b.WriteString(text[:n] + "\n")
		text = text[n:]
	}
	b.WriteString(armorEnd)
	return b.Bytes()
}

// unarmor reads exactly one armoured signature, in the form in which ssh-keygen
// writes it and no other.
func unarmor(b []byte) (*sshsig.Signature, error) {
	if len(b) > MaxSignature {
		return nil, bad("longer than %d bytes", MaxSignature)
	}
	body, ok := strings.CutPrefix(string(b), armorBegin)
	body, ended := strings.CutSuffix(body, armorEnd)
	if !ok || !ended {
		return nil, bad("it is not one armoured SSH signature")
	}
	raw, err := base64.StdEncoding.DecodeString(strings.ReplaceAll(body, "\n", ""))
	if err != nil {
		return nil, bad("its text is not base64")
	}
	s, err := sshsig.ParseSignature(raw)
	if err != nil {
		return nil, bad("%v", err)
	}
	if !bytes.Equal(armor(s), b) {
		return nil, bad("it is not written in its one form")
	}
	return s, nil
}

// Key gives the public key that a signature says it was made with, and its
// fingerprint.
func Key(signature []byte) (ssh.PublicKey, string, error) {
	s, err := unarmor(signature)
	if err != nil {
		return nil, "", err
	}
	return s.PublicKey, ssh.FingerprintSHA256(s.PublicKey), nil
}

// Verify proves that a signature was made over a message with a key, in the
// namespace of this tool. The key is the one of the policy; that in the
// signature has to be the same and is otherwise not relied on.
func Verify(message, signature []byte, key ssh.PublicKey) error {
	s, err := unarmor(signature)
	if err != nil {
		return err
	}
	if s.Namespace != Namespace {
		return bad("its namespace is %q, %q is needed", s.Namespace, Namespace)
	}
	if !bytes.Equal(s.PublicKey.Marshal(), key.Marshal()) {
		return bad("it was made with another key, %s", ssh.FingerprintSHA256(s.PublicKey))
	}
	if err := allowed(key, s.Signature); err != nil {
		return err
	}
	if err := sshsig.Verify(bytes.NewReader(message), s, key, s.HashAlgorithm, Namespace); err != nil {
		return bad("it is not one over this statement")
	}
	return nil
}

// allowed refuses weak keys and algorithms, and security keys that were not
// touched.
func allowed(key ssh.PublicKey, s *ssh.Signature) error {
	plain := []string{ssh.KeyAlgoED25519, ssh.KeyAlgoECDSA256, ssh.KeyAlgoECDSA384, ssh.KeyAlgoECDSA521}
	touched := []string{ssh.KeyAlgoSKED25519, ssh.KeyAlgoSKECDSA256}
	switch {
	case slices.Contains(plain, key.Type()):
		if s.Format != key.Type() {
			return bad("algorithm %q with a key of type %q", s.Format, key.Type())
		}
		if len(s.Rest) != 0 {
			return bad("surplus bytes follow it")
		}
	case slices.Contains(touched, key.Type()):
		if s.Format != key.Type() || len(s.Rest) != 5 {
			return bad("it is not one of a security key")
		}
		// PROTOCOL.u2f: a byte of flags, of which bit 0 says that the key was
		// touched, and a counter.
		if s.Rest[0]&1 == 0 {
			return bad("the security key was not touched")
		}
	case key.Type() == ssh.KeyAlgoRSA:
		if s.Format != ssh.KeyAlgoRSASHA256 && s.Format != ssh.KeyAlgoRSASHA512 {
			return bad("algorithm %q, RSA signs with SHA-256 or SHA-512", s.Format)
		}
		if len(s.Rest) != 0 {
			return bad("surplus bytes follow it")
		}
		public, ok := key.(ssh.CryptoPublicKey).CryptoPublicKey().(*rsa.PublicKey)
		if !ok || public.N.BitLen() < leastRSA {
			return bad("the RSA key is shorter than %d bits", leastRSA)
		}
	default:
		return bad("keys of type %q are refused", key.Type())
	}
	return nil
}

// Sign signs a message.
func Sign(message []byte, signer ssh.Signer) ([]byte, error) {
	s, err := sshsig.Sign(bytes.NewReader(message), signer, sshsig.HashSHA512, Namespace)
	if err != nil {
		return nil, err
	}
	return armor(s), nil
}

// Hash is the SHA-256 of a message in lower-case hex: the identity of a
// statement. The bytes of a signature are none, since an ECDSA signature can be
// altered and stay valid.
func Hash(message []byte) string {
	sum := sha256.Sum256(message)
	return hex.EncodeToString(sum[:])
}

// PolicyHash is the identity of a policy, of the bytes of its two files:
//
//	SHA-256("speedtrail-policy 1\n" hex(SHA-256(signoff.toml)) "\n" hex(SHA-256(allowed_signers)) "\n")
func PolicyHash(signoff, allowedSigners []byte) string {
	h := sha256.New()
	io.WriteString(h, "speedtrail-policy 1\n"+Hash(signoff)+"\n"+Hash(allowedSigners)+"\n")
	return hex.EncodeToString(h.Sum(nil))
}
