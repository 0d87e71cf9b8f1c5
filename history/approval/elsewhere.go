package approval

import "slices"

// Elsewhere is the folder of an older anchor whose policies know a signer without the
// key that he signed with.
type Elsewhere struct {
	Folder string
	Anchor int64 // its entry
}

// Elsewhere tells of a signed record whether the line of approval of another folder,
// with an older anchor, knows the signer's name and not his key; nil where none does.
// Whoever may add to a ledger can anchor a folder of his own, by a policy that gives
// the names of others keys that he made: what is signed with them obeys that policy,
// and is shown under these names.
func (l *Line) Elsewhere(r Record) *Elsewhere {
	own := l.anchors[r.Folder]
	if own == nil {
		return nil
	}
	var first *Elsewhere
	for folder, a := range l.anchors {
		if folder == r.Folder || a.Entry.Seq > own.Entry.Seq || first != nil && first.Anchor < a.Entry.Seq {
			continue
		}
		if known, has := l.knows(a, folder, r); known && !has {
			first = &Elsewhere{folder, a.Entry.Seq}
		}
	}
	return first
}

// knows tells whether the policies that were approved for a folder know the name of a
// signer, and whether one has his key under that name.
func (l *Line) knows(a *AnchorRecord, folder string, r Record) (known, has bool) {
	policies := []Policy{a.Policy}
	for _, w := range l.approvedContents(folder) {
		if w.by != nil {
			policies = append(policies, w.by.Next)
		}
	}
	return slices.ContainsFunc(policies, func(p Policy) bool { return p.Parsed.Known(r.Signer) }),
		slices.ContainsFunc(policies, func(p Policy) bool {
			k := p.Parsed.Key(r.Fingerprint)
			return k != nil && k.Principal == r.Signer
		})
}
