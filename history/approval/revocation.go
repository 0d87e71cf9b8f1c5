package approval

import (
	"speedtrail/history/signoff"
	"speedtrail/schema"
)

// checkKnown refuses a key that no policy has which the line has seen. A revocation of
// it would protect nothing, and look as if it did.
func (l *Line) checkKnown(fingerprint string) error {
	var known []string
	for _, p := range l.policies {
		if p.Parsed == nil {
			continue
		}
		for _, k := range p.Parsed.Keys {
			if k.Fingerprint == fingerprint {
				return nil
			}
			known = append(known, k.Fingerprint)
		}
	}
	return nearly(refuse("no policy in this ledger has a key %s", fingerprint), fingerprint, known)
}

// checkRevocation checks that a key is taken out of use by its owner or by
// somebody who satisfies a role independent of preparer.
func (l *Line) checkRevocation(r *Record) error {
	if err := l.checkForm(r); err != nil {
		return err
	}
	policy, err := l.checkNewest(r)
	if err != nil {
		return err
	}
	if earlier, ok := l.Revoked(r.Key); ok {
		return refuse("the key is revoked already, by entry %d", earlier.Entry.Seq)
	}
	if err := l.checkKnown(r.Key); err != nil {
		return err
	}
	if r.Role == signoff.Owner {
		if k := policy.Key(r.Key); k == nil || k.Principal != r.Signer {
			return refuse("%s is not the owner of the key %s", r.Signer, r.Key)
		}
	} else {
		if err := checkRole(policy, r.Role, r.Signer); err != nil {
			return nearly(err, r.Role, []string{signoff.Owner})
		}
		if !policy.Independent(r.Role, schema.Preparer) {
			return refuse("the role %s is not independent of preparer", r.Role)
		}
	}
	return l.checkNewestSignature(r, policy)
}
