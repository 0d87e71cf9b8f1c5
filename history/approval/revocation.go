package approval

import (
	"speedtrail/history/signoff"
	"speedtrail/schema"
)

// knowsKey tells whether a policy that the line has seen has a key. A revocation of
// another would protect nothing, and look as if it did.
func (l *Line) knowsKey(fingerprint string) bool {
	for _, p := range l.policies {
		if p.Parsed != nil && p.Parsed.Key(fingerprint) != nil {
			return true
		}
	}
	return false
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
	if !l.knowsKey(r.Key) {
		return refuse("no policy in this ledger has a key %s", r.Key)
	}
	if r.Role == signoff.Owner {
		if k := policy.Key(r.Key); k == nil || k.Principal != r.Signer {
			return refuse("%s is not the owner of the key %s", r.Signer, r.Key)
		}
	} else {
		if err := checkRole(policy, r.Role, r.Signer); err != nil {
			return err
		}
		if !policy.Independent(r.Role, schema.Preparer) {
			return refuse("the role %s is not independent of preparer", r.Role)
		}
	}
	return l.checkNewestSignature(r, policy)
}
