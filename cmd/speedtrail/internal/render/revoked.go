package render

import (
	"fmt"
	"strings"
)

// Revocation is how the key of a signature was taken out of use. What the key had
// signed before counts all the same, and wants to be looked at again.
type Revocation struct {
	Entry    int64  `json:"entry"`
	Reason   string `json:"reason"`
	Recorded string `json:"recorded"`
	Signer   string `json:"signer"` // who took it out of use
}

// Short says it in a list; it is empty where the key is in use.
func (r *Revocation) Short() string {
	if r == nil {
		return ""
	}
	return fmt.Sprintf("key revoked in entry %d, %s; review", r.Entry, r.Recorded)
}

// Behind says it behind the key, with the reason.
func (r *Revocation) Behind() string {
	if r == nil {
		return ""
	}
	return fmt.Sprintf("; ! key revoked in entry %d, %s, by %s (%s); review", r.Entry, r.Recorded, r.Signer, r.Reason)
}

// keyWords names the entry and the key of a decision, and says where the key was
// revoked later, or is not that of the name elsewhere.
func (s *SignOff) keyWords() string {
	return fmt.Sprintf("entry %d, key %s", s.Entry, s.Fingerprint) + s.Elsewhere.Behind() + s.Revoked.Behind()
}

// RevokedSignOff is a decision of a list whose key was revoked later.
type RevokedSignOff struct {
	Of int `json:"of"` // its index in the list
	Revocation
}

// WithRevoked says behind decisions of a list that their keys were revoked later.
func WithRevoked(signOffs []string, revoked []RevokedSignOff) []string {
	list := append([]string{}, signOffs...)
	for i := range revoked {
		r := &revoked[i]
		list[r.Of] += " (! " + r.Short() + ")"
	}
	return list
}

// anchorWords says how a commit came to be in force by an anchor; empty where it did not.
func (c *TraceCommit) anchorWords() string {
	entry, words := c.Anchor, "approved, the anchor"
	if entry == "" {
		entry, words = c.InAnchor, "in the history of what the anchor approved as a whole"
	}
	if entry == "" {
		return ""
	}
	seq, _, _ := strings.Cut(entry, ":")
	return words + " (entry " + seq + ")" + c.anchorReview()
}

// anchorReview says which statements of a commit's anchor are by keys that were
// revoked later.
func (c *TraceCommit) anchorReview() string {
	var list []string
	for i := range c.AnchorRevoked {
		r := &c.AnchorRevoked[i]
		list = append(list, c.AnchorSignOffs[r.Of]+" (! "+r.Short()+")")
	}
	if len(list) == 0 {
		return ""
	}
	return ", signed by " + strings.Join(list, ", ")
}
