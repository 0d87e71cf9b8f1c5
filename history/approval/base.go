package approval

import (
	"cmp"
	"slices"
)

// ApprovedCommits lists the commits of a folder whose content is approved and is the
// one that is asked for: that of the anchor and the targets of approved assessments,
// the oldest first.
func (l *Line) ApprovedCommits(folder, tree string) []string {
	var list []string
	if anchor := l.anchors[folder]; anchor != nil && anchor.Content == tree {
		list = append(list, anchor.Revision)
	}
	contents := l.approvedContents(folder)
	for _, a := range l.assessments {
		if a.Folder == folder && a.TargetTree == tree && l.approved(a, contents) && !slices.Contains(list, a.Target) {
			list = append(list, a.Target)
		}
	}
	return list
}

// since is the commit from which the preparers of an assessment are counted.
func (a *Assessment) since() string { return cmp.Or(a.Since, a.Base) }

// counted tells whether the preparers of an assessment are counted from an approved
// commit. Another commit of the same content can have more history than that:
// people who prepared what the target takes up, in a branch that the base joined
// without its content.
func (l *Line) counted(a *Assessment) bool {
	return slices.Contains(l.ApprovedCommits(a.Folder, a.BaseTree), a.since())
}

// otherPolicy says where an assessment gives a content another policy than the
// approved one of that content has: a policy is part of the content, so one of them
// is not what Git holds.
func (l *Line) otherPolicy(a *Assessment) string {
	contents := l.approvedContents(a.Folder)
	for _, side := range []struct{ name, tree, policy string }{{"base", a.BaseTree, a.Policy.Hash}, {"target", a.TargetTree, a.Next.Hash}} {
		w, ok := contents[side.tree]
		if !ok {
			continue
		}
		known := l.anchors[a.Folder].Policy.Hash
		if w.by != nil {
			known = w.by.Next.Hash
		}
		if known != side.policy {
			return "its " + side.name + " has another policy than the approved revision of the same content"
		}
	}
	return ""
}
