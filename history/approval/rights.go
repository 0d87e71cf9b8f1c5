package approval

import (
	"strings"
	"time"

	"speedtrail/history/signoff"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// checkSignature checks the signer and the signature by a policy.
func (l *Line) checkSignature(r *Record, p *schema.Policy) error {
	if r.foreseen && r.Fingerprint == "" {
		return l.foreseeKey(r, p)
	}
	if !r.foreseen {
		var err error
		if _, r.Fingerprint, err = signoff.Key(r.Signature); err != nil {
			return err
		}
	}
	if revocation, ok := l.Revoked(r.Fingerprint); ok {
		return refuse("the key %s was revoked by entry %d: %s", r.Fingerprint, revocation.Entry.Seq, revocation.Reason)
	}
	key, err := allowedKey(p, r.Fingerprint, r.Signer, r.Time, r.Recorded)
	if err != nil || r.foreseen {
		return err
	}
	return signoff.Verify(r.Text, r.Signature, key.Public)
}

// foreseeKey refuses a statement for whose signer no key could sign it.
func (l *Line) foreseeKey(r *Record, p *schema.Policy) error {
	problem := refuse("%s has no key in this policy", r.Signer)
	for i := range p.Keys {
		k := &p.Keys[i]
		if k.Principal != r.Signer {
			continue
		}
		revocation, revoked := l.Revoked(k.Fingerprint)
		if revoked {
			problem = refuse("the key %s was revoked by entry %d: %s", k.Fingerprint, revocation.Entry.Seq, revocation.Reason)
			continue
		}
		_, err := allowedKey(p, k.Fingerprint, r.Signer, r.Time, r.Recorded)
		if err == nil {
			return nil
		}
		problem = err
	}
	return problem
}

// allowedKey finds the line of allowed_signers that lets a principal sign with a
// key at two times.
func allowedKey(p *schema.Policy, fingerprint, signer string, times ...time.Time) (*schema.Key, error) {
	var found *schema.Key
	problem := refuse("the key %s is not allowed to anyone by this policy", fingerprint)
	for i := range p.Keys {
		k := &p.Keys[i]
		if k.Fingerprint != fingerprint {
			continue
		}
		if k.Principal != signer {
			return nil, refuse("the key %s belongs to %s, not to the signer %s", fingerprint, k.Principal, signer)
		}
		if !k.Signs() {
			problem = refuse("the key %s is not for the namespace %s", fingerprint, signoff.Namespace)
			continue
		}
		valid := true
		for _, t := range times {
			switch {
			case !k.ValidAfter.IsZero() && t.Before(k.ValidAfter):
				valid, problem = false, refuse("the key %s is valid from %s only", fingerprint, k.ValidAfter.UTC().Format(signoff.TimeLayout))
			case !k.ValidBefore.IsZero() && t.After(k.ValidBefore):
				valid, problem = false, refuse("the key %s was valid until %s", fingerprint, k.ValidBefore.UTC().Format(signoff.TimeLayout))
			}
		}
		if valid {
			found = k
		}
	}
	if found == nil {
		return nil, problem
	}
	return found, nil
}

// checkRole tells why a policy does not let a signer take a role; nil where it does.
func checkRole(p *schema.Policy, role, signer string) error {
	r := p.Role(role)
	if r == nil {
		var names []string
		for _, x := range p.Roles {
			names = append(names, x.Name)
		}
		return nearly(refuse("the policy has no role %q; it has %s", role, strings.Join(names, ", ")), role, names)
	}
	if !r.May(signer) {
		problem := refuse("%s is no signer of the role %s", signer, role)
		if p.Known(signer) { // no mistyped name, and no reason to sign as somebody else
			return problem
		}
		return nearly(problem, signer, r.Signers)
	}
	if !p.Known(signer) {
		var names []string
		for _, x := range p.Persons {
			names = append(names, x.Principal)
		}
		return nearly(refuse("%s is no person of the policy", signer), signer, names)
	}
	return nil
}

// nearly adds to a refusal which names a mistyped one can have meant.
func nearly(err error, name string, known []string) error {
	near := schema.Nearest(name, known)
	if len(near) == 0 {
		return err
	}
	for i := range near {
		near[i] = source.Visible(near[i])
	}
	return &hinted{err, "did you mean " + strings.Join(near, " or ") + "?"}
}
