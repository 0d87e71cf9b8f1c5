package schema

import (
	"bytes"
	"crypto/rsa"
	"fmt"
	"strings"
	"time"

	"golang.org/x/crypto/ssh"

	"speedtrail/schema/source"
	"speedtrail/schema/table"
)

// allowedSigners reads the OpenSSH file of that name (ssh-keygen(1), ALLOWED
// SIGNERS) in a strict form: one literal lower-case principal a line, plain
// keys, literal namespaces, times in UTC. What it takes ssh-keygen takes as well.
func (r *reader) allowedSigners(p *Policy, content []byte) {
	if !table.CheckUTF8(signersFile, content, &r.faults) {
		return
	}
	if line, ok := table.MergeMarker(content); ok {
		r.faults.Add(source.Position{File: signersFile, Line: line, Column: 1}, "%s", table.Unresolved)
		return
	}
	owners := map[string]string{}
	line := 0
	for text := range bytes.Lines(content) {
		line++
		at := source.Position{File: signersFile, Line: line, Column: 1}
		row := strings.TrimSpace(string(text))
		if row == "" || strings.HasPrefix(row, "#") {
			continue
		}
		k, problem := signerLine(row)
		if problem != "" {
			r.faults.Add(at, "%s", problem)
			continue
		}
		k.Pos = at
		if owner, ok := owners[k.Fingerprint]; ok && owner != k.Principal {
			r.faults.Add(at, "the key %s is that of %s, too; a key belongs to one principal", k.Fingerprint, source.Quote(owner))
			continue
		}
		owners[k.Fingerprint] = k.Principal
		p.Keys = append(p.Keys, k)
	}
}

// signerLine reads one line; problem says what is wrong with it.
func signerLine(row string) (k Key, problem string) {
	principal, rest, _ := strings.Cut(row, " ")
	if !madeOf(principal, 200, "._%+@-", false) {
		return k, "principal " + source.Quote(principal) + " is not one literal name in lower case; lists and wildcards are refused"
	}
	k.Principal = principal
	public, _, options, extra, err := ssh.ParseAuthorizedKey([]byte(strings.TrimSpace(rest)))
	if err != nil || len(extra) > 0 {
		return k, "no public key can be read: a line is PRINCIPAL [OPTIONS] KEYTYPE KEY"
	}
	switch public.Type() {
	case ssh.KeyAlgoED25519, ssh.KeyAlgoECDSA256, ssh.KeyAlgoECDSA384, ssh.KeyAlgoECDSA521, ssh.KeyAlgoSKED25519, ssh.KeyAlgoSKECDSA256, ssh.KeyAlgoRSA:
	default:
		return k, "key type " + source.Quote(public.Type()) + " is refused; allowed are Ed25519, ECDSA, RSA and their security key forms, certificates are not"
	}
	if bits := rsaBits(public); bits > 0 && bits < leastRSABits {
		return k, fmt.Sprintf("an RSA key of %d bits is refused, at least %d are needed", bits, leastRSABits)
	}
	// The library passes over empty options, and over commas that divide nothing.
	after, _ := strings.CutPrefix(strings.TrimSpace(rest), strings.Join(options, ","))
	if !strings.HasPrefix(strings.TrimLeft(after, " \t"), public.Type()) {
		return k, "the options are not divided by one comma each"
	}
	if problem = k.options(options); problem != "" {
		return k, problem
	}
	k.Public, k.Fingerprint = public, ssh.FingerprintSHA256(public)
	return k, ""
}

// options reads the options of a line; problem says what is wrong with them.
func (k *Key) options(list []string) (problem string) {
	values := map[string]string{}
	for _, option := range list {
		name, given, _ := strings.Cut(option, "=")
		lower := strings.ToLower(name)
		if _, ok := values[lower]; ok {
			return "option " + source.Quote(name) + " stands twice"
		}
		switch lower {
		case "namespaces", "valid-after", "valid-before":
		case "cert-authority":
			return "cert-authority is refused: who holds such a key could make any signer"
		default:
			return "option " + source.Quote(name) + " is not known"
		}
		value, ok := unquoted(given)
		if !ok {
			return "option " + source.Quote(option) + " is not written NAME=\"VALUE\", as ssh-keygen has it"
		}
		values[lower] = value
		switch lower {
		case "namespaces":
			k.Namespaces = strings.Split(value, ",")
			problem = namespaceProblem(k.Namespaces)
		case "valid-after":
			k.ValidAfter, problem = signerTime(value)
		case "valid-before":
			k.ValidBefore, problem = signerTime(value)
		}
		if problem != "" {
			return name + " " + source.Quote(value) + " " + problem
		}
	}
	if !k.ValidAfter.IsZero() && !k.ValidBefore.IsZero() && !k.ValidAfter.Before(k.ValidBefore) {
		return "valid-after " + source.Quote(values["valid-after"]) + " is not before valid-before " + source.Quote(values["valid-before"])
	}
	return ""
}

// unquoted gives what stands between two quotes, which is all that an option has.
func unquoted(s string) (string, bool) {
	if len(s) < 2 || s[0] != '"' || s[len(s)-1] != '"' {
		return "", false
	}
	s = s[1 : len(s)-1]
	return s, !strings.ContainsAny(s, `"\\`)
}

// namespaceProblem says what is wrong with a list of namespaces. To ssh-keygen each
// is a pattern, and one with '!' in front takes back what others give; here they
// are names, so that both read the same.
func namespaceProblem(names []string) string {
	for _, name := range names {
		switch {
		case strings.ContainsAny(name, "!*?"):
			return "is not a list of literal names; wildcards and exclusions by '!' are refused"
		case !madeOf(name, 100, "-._+@", true):
			return "is not a list of names of letters, digits and '-._+@' with commas and no blanks between them"
		}
	}
	return ""
}

// leastRSABits is what an RSA key has at least: shorter ones can be broken.
const leastRSABits = 2048

// rsaBits gives the length of an RSA key; 0 for a key of another type.
func rsaBits(public ssh.PublicKey) int {
	if c, ok := public.(ssh.CryptoPublicKey); ok {
		if k, ok := c.CryptoPublicKey().(*rsa.PublicKey); ok {
			return k.N.BitLen()
		}
	}
	return 0
}

// signerTime reads YYYYMMDDZ, YYYYMMDDHHMMZ or YYYYMMDDHHMMSSZ.
func signerTime(s string) (t time.Time, problem string) {
	// Parse takes fractions of a second unasked.
	if strings.Contains(s, ".") || strings.Contains(s, ",") {
		return t, notUTC
	}
	for _, layout := range []string{"20060102Z", "200601021504Z", "20060102150405Z"} {
		t, err := time.Parse(layout, s)
		switch {
		case err != nil:
			continue
		case !plausible(t):
			return time.Time{}, implausible
		}
		return t, ""
	}
	return time.Time{}, notUTC
}

const notUTC = "is no time in UTC such as 20260301Z or 202603010600Z"
