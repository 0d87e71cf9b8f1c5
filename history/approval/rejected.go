package approval

import (
	"fmt"
	"slices"

	"speedtrail/history/signoff"
	"speedtrail/schema"
)

// lost is what a rejection took out of force. A rejection takes data out of approval,
// and does not bring back what a policy no longer allowed.
type lost struct {
	way                     // the release
	through map[string]bool // the contents of the way to it, its own among them
	at      int64           // the entry of the rejection
	policy  bool            // the policy that the release had turned to was in force
	keys    map[string]bool // keys that the release had taken out
}

// decide takes up a sign-off that is recorded now, and notes what a rejection takes out
// of force.
func (l *Line) decide(r Record) {
	if r.Decision != signoff.Reject || !l.ApprovedContent(r.Folder, l.byNumber[r.Assessment].TargetTree) {
		l.take(r)
		return
	}
	contents, turns, newest, out := l.approvedContents(r.Folder), l.turns(r.Folder), l.Newest(r.Folder), l.allTakenOut(r.Folder)
	l.take(r)
	var list []lost
	of := func(w way) *lost {
		i := slices.IndexFunc(list, func(x lost) bool { return x.by == w.by })
		if i < 0 {
			i, list = len(list), append(list, lost{way: w, through: wayTo(contents, w.by), at: r.Entry.Seq, keys: map[string]bool{}})
		}
		return &list[i]
	}
	if l.Newest(r.Folder).Hash != newest.Hash {
		of(turns[len(turns)-1]).policy = true
	}
	for key, by := range out {
		if l.takenOut(r.Folder, key) == nil {
			of(way{by: by}).keys[key] = true
		}
	}
	l.lost[r.Folder] = append(l.lost[r.Folder], list...)
}

// allTakenOut gives the keys that are taken out for a folder, each with the assessment
// that took it out.
func (l *Line) allTakenOut(folder string) map[string]*Assessment {
	list := map[string]*Assessment{}
	for _, p := range l.policies {
		if p.Parsed == nil {
			continue
		}
		for i := range p.Parsed.Keys {
			key := p.Parsed.Keys[i].Fingerprint
			if _, known := list[key]; !known {
				list[key] = l.takenOut(folder, key)
			}
		}
	}
	for key, by := range list {
		if by == nil {
			delete(list, key)
		}
	}
	return list
}

// wayTo gives the contents through which approval leads to the target of an assessment.
func wayTo(contents map[string]way, a *Assessment) map[string]bool {
	through := map[string]bool{a.TargetTree: true}
	for a != nil && !through[a.BaseTree] {
		through[a.BaseTree] = true
		a = contents[a.BaseTree].by
	}
	return through
}

// rejected lists the policies that a rejection took out of force, the last one first:
// they ask on until a newer one is in force. content is what is to be decided on, empty
// where nothing is: what led to such a release was approved before its policy asked
// anything, and may be so again.
func (l *Line) rejected(folder, content string) []Policy {
	var list []Policy
	if len(l.lost[folder]) == 0 {
		return list
	}
	turns := l.turns(folder)
	newest := l.Newest(folder)
	for _, x := range slices.Backward(l.lost[folder]) {
		over := slices.ContainsFunc(turns, func(w way) bool { return w.by.TargetTree == x.by.TargetTree || inOrder(w, x.way) > 0 })
		known := x.by.Next.Hash == newest.Hash || slices.ContainsFunc(list, func(p Policy) bool { return p.Hash == x.by.Next.Hash })
		if x.policy && !over && !known && !x.through[content] {
			list = append(list, x.by.Next)
		}
	}
	return list
}

// Rejected lists the policies that ask about an assessment beside that of its base and
// the newest approved one: they were in force until somebody rejected their releases.
func (l *Line) Rejected(a *Assessment) []Policy { return l.rejected(a.Folder, a.TargetTree) }

// stillOut gives the release that took a key out of the policy of a folder and was
// rejected since, where no newer policy has the key again; nil where there is none.
func (l *Line) stillOut(folder, content, fingerprint string) *lost {
	for i := range l.lost[folder] {
		x := &l.lost[folder][i]
		back := slices.ContainsFunc(l.turns(folder), func(w way) bool {
			return w.first > x.at && w.by.Next.Parsed != nil && w.by.Next.Parsed.Key(fingerprint) != nil
		})
		if x.keys[fingerprint] && !back && !x.through[content] {
			return x
		}
	}
	return nil
}

// whoseRejected is what refusals call such a policy.
const whoseRejected = "the policy that was in force until its release was rejected"

// byRejected adds to a refusal by such a policy how it ends.
func (l *Line) byRejected(folder string, p *schema.Policy, err error) error {
	for _, x := range slices.Backward(l.lost[folder]) {
		if err != nil && x.policy && x.by.Next.Parsed == p {
			return &hinted{err, fmt.Sprintf("the policy of the target of assessment %d asks on, though entry %d rejected it, until a newer policy is approved; who rejected it can approve it again", x.by.Number, x.at)}
		}
	}
	return err
}
