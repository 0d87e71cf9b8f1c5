package approval

import (
	"fmt"
	"slices"

	"speedtrail/history/signoff"
	"speedtrail/schema"
)

// part is what a person does for an assessment.
type part struct{ role, signer string }

// need is how many people a role has, and how many it needs.
type need struct {
	role         string
	have, needed int
}

// needs counts, for the roles of a policy that take part in approvals, the people
// who approve and may do so by that policy, in parts that are independent of each
// other. approve holds, for each part, a number that grows with the order of the
// decisions.
func needs(p *schema.Policy, a *Assessment, approve map[part]int) []need {
	var list []need
	for _, role := range p.Roles {
		if role.Name == InServiceRole {
			continue
		}
		n := need{role: role.Name, needed: role.Needed}
		for x, at := range approve {
			if x.role == role.Name && checkRole(p, x.role, x.signer) == nil && !prepared(p, a, x) && !takenBefore(p, x, at, approve) {
				n.have++
			}
		}
		list = append(list, n)
	}
	return list
}

// prepared tells whether a signer prepared the change in spite of a role that is
// independent of preparer.
func prepared(p *schema.Policy, a *Assessment, x part) bool {
	if !p.Independent(x.role, schema.Preparer) {
		return false
	}
	_, _, ok := a.hand(p, x.signer)
	return ok
}

// hand gives the address with which a signer prepared the change, or may have: an
// address belongs to the person to whom the policy of the base or another one gives
// it, as whoever is called otherwise since is the same. Of a signer whom that of the
// base does not know, an address that the other one does not know may be his.
func (a *Assessment) hand(p *schema.Policy, signer string) (email string, known, ok bool) {
	base := a.Policy.Parsed
	inBase := base.Known(signer)
	for _, email := range a.Preparers {
		here, there := p.Person(email), base.Person(email)
		if here != nil && here.Principal == signer || there != nil && there.Principal == signer {
			return email, true, true
		}
		if here == nil && !inBase {
			return email, false, true
		}
	}
	return "", false, false
}

// takenBefore tells whether a signer took another part earlier that the role has to
// be independent of.
func takenBefore(p *schema.Policy, x part, at int, approve map[part]int) bool {
	for y, earlier := range approve {
		if y.signer == x.signer && y.role != x.role && earlier < at && p.Independent(x.role, y.role) {
			return true
		}
	}
	return false
}

// met tells whether the roles of the base's policy have the people that they need,
// and those of the policies that asked at a decision: whoever chooses an old base, or
// rejects a new one, does not choose the rules.
func met(a *Assessment, approve map[part]int, at *Record) bool {
	for _, p := range append([]*schema.Policy{a.Policy.Parsed, at.inForce}, at.rejected...) {
		if p == nil || slices.ContainsFunc(needs(p, a, approve), func(n need) bool { return n.have < n.needed }) {
			return false
		}
	}
	return true
}

// standing gives the parts whose last decision on an assessment is to approve, each
// with the place in signOffs since which that is so.
func (l *Line) standing(a *Assessment) map[part]int {
	since := map[part]int{}
	for _, i := range l.ofAssessment[a.Number] {
		r := &l.signOffs[i]
		x := part{r.Role, r.Signer}
		if r.Decision != signoff.Approve {
			delete(since, x)
		} else if _, ok := since[x]; !ok {
			since[x] = i
		}
	}
	return since
}

// completed gives the entry with which the roles of an assessment had the people
// that they need, of those whose approvals stand; 0 where they do not have them.
// Where a rejection of the content was cleared, they have to have them then, by the
// policy of then, or later.
func (l *Line) completed(a *Assessment) int64 {
	since := l.standing(a)
	floor := l.cleared(a.content())
	points := slices.Clone(l.ofAssessment[a.Number])
	if floor >= 0 && !slices.Contains(points, floor) {
		points = append(points, floor)
		slices.Sort(points)
	}
	for _, i := range points {
		if i < floor {
			continue
		}
		approve := map[part]int{}
		for x, at := range since {
			if at <= i {
				approve[x] = at
			}
		}
		if r := &l.signOffs[i]; met(a, approve, r) {
			return r.Entry.Seq
		}
	}
	return 0
}

// cleared gives the place in signOffs of the last decision with which somebody who
// had rejected a content approved it; -1 where nobody had.
func (l *Line) cleared(c content) int {
	rejects := map[string]bool{}
	last := -1
	for _, i := range l.ofContent[c] {
		r := &l.signOffs[i]
		now := r.Decision == signoff.Reject
		if rejects[r.Signer] && !now {
			last = i
		}
		rejects[r.Signer] = now
	}
	return last
}

// missing lists the roles that lack people for an assessment: by the policy of its
// base, by the one that is in force now, and by newer ones that are rejected.
func (l *Line) missing(a *Assessment) []string {
	if a.Policy.Parsed == nil || l.completed(a) > 0 {
		return nil
	}
	approve := l.standing(a)
	list := needs(a.Policy.Parsed, a, approve)
	for _, p := range append([]Policy{l.Newest(a.Folder)}, l.Rejected(a)...) {
		if p.Parsed == nil {
			continue
		}
		for _, n := range needs(p.Parsed, a, approve) {
			i := slices.IndexFunc(list, func(have need) bool { return have.role == n.role })
			if i < 0 {
				list = append(list, n)
			} else if list[i].needed-list[i].have < n.needed-n.have {
				list[i] = n
			}
		}
	}
	var words []string
	for _, n := range list {
		if n.have < n.needed {
			words = append(words, fmt.Sprintf("%s (%d of %d)", n.role, n.have, n.needed))
		}
	}
	return words
}
