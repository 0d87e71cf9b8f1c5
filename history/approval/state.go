package approval

import (
	"cmp"
	"slices"
	"strings"

	"speedtrail/history/signoff"
)

// States of an assessment.
const (
	Open     = "open"
	Partly   = "partly signed"
	Approved = "approved"
	Rejected = "rejected"
	// Unreadable is that of an assessment whose body cannot be read; it counts for
	// nothing.
	Unreadable = "not readable"
)

// State is what the ledger says about an assessment.
type State struct {
	Word    string
	Missing []string // roles that lack people, "checker (1 of 2)"
	Blocks  []string // findings that keep it from being approved
	Signed  []Record // the decisions on it, in the order of the ledger
	// RejectedBy are rejections of the same content that stand, also those of
	// other assessments.
	RejectedBy []Record
	// Superseded is the number of another assessment from the same base that is
	// approved; 0 for none. It is a remark and hides nothing.
	Superseded int64
}

// content is what a rejection follows: the data, not the assessment's number.
type content struct{ folder, tree string }

func (a *Assessment) content() content { return content{a.Folder, a.TargetTree} }

// State gives the state of an assessment.
func (l *Line) State(number int64) State {
	a := l.byNumber[number]
	if a == nil {
		return State{Word: Unreadable}
	}
	s := State{Word: Open}
	for _, i := range l.ofAssessment[number] {
		s.Signed = append(s.Signed, l.signOffs[i])
	}
	s.Missing = l.missing(a)
	s.Blocks = l.blocks(a)
	s.RejectedBy = l.rejections(a.content())
	contents := l.approvedContents(a.Folder)
	switch {
	case len(s.RejectedBy) > 0:
		s.Word = Rejected
	case l.approved(a, contents):
		s.Word = Approved
	case len(l.standing(a)) > 0:
		s.Word = Partly
	}
	for _, other := range l.assessments {
		if other != a && other.Folder == a.Folder && other.Base == a.Base && other.TargetTree != a.TargetTree && l.approved(other, contents) {
			s.Superseded = other.Number
		}
	}
	return s
}

// Rejections lists the rejections of the tree of a folder that stand.
func (l *Line) Rejections(folder, tree string) []Record { return l.rejections(content{folder, tree}) }

// rejections lists the rejections of a content that stand: of people whose last
// decision on it, on whatever assessment, is to reject.
func (l *Line) rejections(c content) []Record {
	last := map[string]Record{}
	for _, i := range l.ofContent[c] {
		last[l.signOffs[i].Signer] = l.signOffs[i]
	}
	var list []Record
	for _, r := range last {
		if r.Decision == signoff.Reject {
			list = append(list, r)
		}
	}
	slices.SortFunc(list, func(a, b Record) int { return int(a.Entry.Seq - b.Entry.Seq) })
	return list
}

// UnknownPreparers lists the addresses of preparers who are no person of the
// base's policy, and says so where one has none.
func (a *Assessment) UnknownPreparers() []string {
	if a.Policy.Parsed == nil {
		return nil
	}
	var list []string
	for _, email := range a.Preparers {
		if a.Policy.Parsed.Person(email) == nil {
			list = append(list, cmp.Or(email, "somebody without an address"))
		}
	}
	return list
}

// blocks lists what keeps an assessment from being approved.
func (l *Line) blocks(a *Assessment) []string {
	var list []string
	if a.BaseNotAncestor {
		list = append(list, "base-not-ancestor")
	}
	if l.anchors[a.Folder] == nil {
		return append(list, "no policy is anchored")
	}
	if !l.ApprovedContent(a.Folder, a.BaseTree) {
		list = append(list, "base-not-approved")
	} else if problem := l.otherPolicy(a); problem != "" {
		list = append(list, problem)
	} else if !l.counted(a) {
		list = append(list, "assess again: its preparers are counted from "+a.since()+", which is not the approved commit")
	}
	if unknown := a.UnknownPreparers(); len(unknown) > 0 {
		list = append(list, "unknown-preparer: "+strings.Join(unknown, ", "))
	}
	return list
}

// way is how a content came to be approved: by an assessment, nil for the anchor.
type way struct {
	by *Assessment
	// first is the entry at which the way was complete for the first time, whatever
	// was taken back and given again since; depth is how many releases it has.
	first int64
	depth int
}

// firstSigned gives the entry with which all roles had signed an assessment for the
// first time, while nobody's rejection of the content stood; 0 where that never was.
func (l *Line) firstSigned(a *Assessment) int64 {
	at, ok := l.begun[a.Number]
	if !ok {
		at = l.firstMet(a)
		l.begun[a.Number] = at
	}
	return at
}

func (l *Line) firstMet(a *Assessment) int64 {
	approve := map[part]int{}
	rejects := map[string]bool{} // who rejects the content
	for _, i := range l.ofContent[a.content()] {
		r := &l.signOffs[i]
		if r.Decision == signoff.Approve {
			delete(rejects, r.Signer)
		} else {
			rejects[r.Signer] = true
		}
		if r.Assessment == a.Number {
			x := part{r.Role, r.Signer}
			if r.Decision != signoff.Approve {
				delete(approve, x)
			} else if _, ok := approve[x]; !ok {
				approve[x] = i
			}
		}
		if len(rejects) == 0 && met(a, approve, r) {
			return r.Entry.Seq
		}
	}
	return 0
}

// signedOff gives the entry with which all roles had signed an assessment, and 0
// where they have not, or where more than the line of approval keeps it from
// being approved.
func (l *Line) signedOff(a *Assessment) int64 {
	if at, ok := l.done[a.Number]; ok {
		return at
	}
	at := l.lastNeeded(a)
	if len(l.ofAssessment[a.Number]) > 0 {
		l.done[a.Number] = at
	}
	return at
}

func (l *Line) lastNeeded(a *Assessment) int64 {
	if len(l.ofAssessment[a.Number]) == 0 || a.Policy.Parsed == nil || a.Next.Parsed == nil || a.BaseNotAncestor || len(a.Preparers) == 0 || len(a.UnknownPreparers()) > 0 || len(l.rejections(a.content())) > 0 {
		return 0
	}
	return l.completed(a)
}

// approvedContents gives the contents of a folder that are approved: the
// anchor's, and those that approved assessments lead to from it, each by the way
// that was complete first, whatever was taken back and given again since.
func (l *Line) approvedContents(folder string) map[string]way {
	if known := l.contents[folder]; known != nil {
		return known
	}
	approved := map[string]way{}
	l.contents[folder] = approved
	anchor := l.anchors[folder]
	if anchor == nil {
		return approved
	}
	approved[anchor.Content] = way{first: anchor.Entry.Seq}
	for grown := true; grown; {
		grown = false
		for _, a := range l.assessments {
			base, ok := approved[a.BaseTree]
			if !ok || a.Folder != folder {
				continue
			}
			signed := l.signedOff(a)
			if signed == 0 {
				continue
			}
			first := max(base.first, cmp.Or(l.firstSigned(a), signed))
			if have, ok := approved[a.TargetTree]; !ok || first < have.first {
				approved[a.TargetTree], grown = way{a, first, base.depth + 1}, true
			}
		}
	}
	return approved
}

func (l *Line) approved(a *Assessment, contents map[string]way) bool {
	_, ok := contents[a.BaseTree]
	return ok && l.signedOff(a) > 0
}

// ApprovedContent tells whether a content of a folder is approved.
func (l *Line) ApprovedContent(folder, tree string) bool {
	_, ok := l.approvedContents(folder)[tree]
	return ok
}
